"""Which of the rival models a solution uses, by name."""

from __future__ import annotations

from dataclasses import dataclass

from bemt.errors import InputError

END_LOSS_LAWS = ("prandtl", "goldstein", "none")
END_LOSS_ENDS = ("tip", "root")
STALL_DELAY_LAWS = ("snel", "du-selig", "none")
POST_STALL_LAWS = ("plate", "viterna", "aerodas")
REYNOLDS_RULES = ("power-law", "held")
INFLOW_LAWS = ("momentum", "helix")


@dataclass(frozen=True)
class Model:
    """Settings of the solution; the defaults serve.

    Parameters
    ----------
    elements : int
        Blade elements, cosine spaced from root to tip; 8 to 400.
    inflow : {"momentum", "helix"}
        Law that ties the induced velocity to the loading.
    end_loss : {"prandtl", "goldstein", "none"}
        Loss of circulation at the blade's ends.
    end_loss_ends : tuple of {"tip", "root"}
        Ends at which it is applied.
    stall_delay : {"snel", "du-selig", "none"}
        What rotation does to lift and drag beyond stall.
    stall_strength : float
        Share of the stall-delay law that is applied, 0 to 1.
    post_stall : {"plate", "viterna", "aerodas"}
        Law of lift and drag past the section's data.
    plate_drag : float
        Section drag coefficient at 90 deg.
    reynolds_rule : {"power-law", "held"}
        Drag at Reynolds numbers beyond the section's data.
    drag_scale : float
        Factor on the section's attached-flow drag.

    Raises
    ------
    InputError
        If a value is out of its range.
    """

    elements: int = 40
    inflow: str = "momentum"
    end_loss: str = "prandtl"
    end_loss_ends: tuple[str, ...] = END_LOSS_ENDS
    stall_delay: str = "snel"
    stall_strength: float = 0.5
    post_stall: str = "plate"
    plate_drag: float = 1.8
    reynolds_rule: str = "power-law"
    drag_scale: float = 1.0

    def __post_init__(self) -> None:
        if not 8 <= self.elements <= 400:
            raise InputError("elements", f"{self.elements}; between 8 and 400 blade elements")
        for name, laws in (
            ("inflow", INFLOW_LAWS),
            ("end_loss", END_LOSS_LAWS),
            ("stall_delay", STALL_DELAY_LAWS),
            ("post_stall", POST_STALL_LAWS),
            ("reynolds_rule", REYNOLDS_RULES),
        ):
            if getattr(self, name) not in laws:
                raise InputError(name, f"{getattr(self, name)!r}; one of {', '.join(laws)}")
        if not set(self.end_loss_ends) <= set(END_LOSS_ENDS):
            raise InputError("end_loss", f"ends are among {', '.join(END_LOSS_ENDS)}")
        if not 0 <= self.stall_strength <= 1:
            raise InputError("stall_strength", f"{self.stall_strength:g}; a share between 0 and 1")
        if not 1.0 <= self.plate_drag <= 2.2:
            raise InputError("plate_drag", f"{self.plate_drag:g}; a plate across the flow has 1.0 to 2.2")
        if not 0.1 <= self.drag_scale <= 10:
            raise InputError("drag_scale", f"{self.drag_scale:g}; between 0.1 and 10")
