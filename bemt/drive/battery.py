"""The battery as an open-circuit voltage that depends on the charge left, behind a resistance."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemt.errors import InputError
from bemt.quantities.checks import (
    require_count,
    require_not_negative,
    require_one_of,
    require_positive,
    require_share,
)

# Voltage of one rested cell over the share of charge left. From memory, typical of the chemistry (lithium-ion: a
# nickel-rich cylindrical cell); single makes differ by some 0.05 V, more below a tenth of the charge.
OPEN_CIRCUIT_VOLTAGE: dict[str, tuple[tuple[float, ...], tuple[float, ...]]] = {
    "lithium-polymer": (
        (0.0, 0.05, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 1.0),
        (3.30, 3.61, 3.69, 3.73, 3.77, 3.80, 3.84, 3.87, 3.95, 4.02, 4.11, 4.20),
    ),
    "lithium-ion": (
        (0.0, 0.05, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 1.0),
        (2.90, 3.15, 3.30, 3.45, 3.54, 3.61, 3.68, 3.79, 3.88, 3.97, 4.06, 4.18),
    ),
}
CHEMISTRIES = tuple(OPEN_CIRCUIT_VOLTAGE)

# Resistance over temperature as exp(B (1/T - 1/T0)), Arrhenius's law. B doubles the resistance from 20 to 0 degrees
# Celsius: from memory, typical of both chemistries; single makes range from a half more to thrice.
RESISTANCE_TEMPERATURE = 293.15  # K, at which the cell resistance is stated
RESISTANCE_GROWTH = 2775.0  # K
_COLDEST, _HOTTEST = 233.15, 343.15  # K


@dataclass(frozen=True)
class Battery:
    """A pack of equal cells.

    Parameters
    ----------
    cells_in_series : int
        Cells that add their voltages.
    cell_resistance : float
        Direct-current resistance of one cell at 20 degrees Celsius [ohm].
    capacity : float
        Charge of the full pack [C]; 1 A h is 3600 C.
    cells_in_parallel : int
        Strings that share the current.
    chemistry : {"lithium-polymer", "lithium-ion"}
        Names the open-circuit voltage curve.
    discharge_multiple : float, optional
        Largest current as a multiple of the capacity per hour.
    charge_left : float
        Share of the capacity at which voltages and currents are computed, 0 to 1.
    usable_share : float
        Share of the capacity that may be used; the rest stays in the pack.
    temperature : float
        Of the cells [K], -40 to 70 degrees Celsius; the resistance grows in the cold, the capacity is left alone.

    Raises
    ------
    InputError
        If a value is out of range.
    """

    cells_in_series: int
    cell_resistance: float
    capacity: float
    cells_in_parallel: int = 1
    chemistry: str = "lithium-polymer"
    discharge_multiple: float | None = None
    charge_left: float = 1.0
    usable_share: float = 0.8
    temperature: float = RESISTANCE_TEMPERATURE

    def __post_init__(self) -> None:
        """Refuse values that describe no pack."""
        require_count("cells_in_series", self.cells_in_series)
        require_count("cells_in_parallel", self.cells_in_parallel)
        require_one_of("chemistry", self.chemistry, CHEMISTRIES)
        require_positive("capacity", self.capacity, "C")
        require_not_negative("cell_resistance", self.cell_resistance, "ohm")
        if self.discharge_multiple is not None:
            require_positive("discharge_multiple", self.discharge_multiple)
        require_share("charge_left", self.charge_left)
        require_share("usable_share", self.usable_share)
        require_positive("temperature", self.temperature, "K")
        if not _COLDEST <= self.temperature <= _HOTTEST:
            raise InputError(
                "temperature", f"{self.temperature - 273.15:.4g} degC is not that of a working cell, -40 to 70 degC"
            )

    @property
    def resistance(self) -> float:
        """Resistance of the pack at its temperature [ohm]."""
        growth = math.exp(RESISTANCE_GROWTH * (1.0 / self.temperature - 1.0 / RESISTANCE_TEMPERATURE))
        return self.cell_resistance * growth * self.cells_in_series / self.cells_in_parallel

    @property
    def open_circuit_voltage(self) -> float:
        """Voltage of the rested pack at the charge left [V]."""
        return self.cells_in_series * float(cell_voltage(self.chemistry, self.charge_left))

    @property
    def current_limit(self) -> float | None:
        """Largest current of the pack [A]; None where no multiple is known."""
        return None if self.discharge_multiple is None else self.discharge_multiple * self.capacity / 3600.0

    @property
    def lowest_charge(self) -> float:
        """Share of the capacity that has to stay in the pack."""
        return 1.0 - self.usable_share

    @property
    def largest_power(self) -> float:
        """Largest power at the terminals at the charge left, Voc^2/(4 R) [W]; infinite without resistance."""
        return self.open_circuit_voltage**2 / (4.0 * self.resistance) if self.resistance > 0.0 else math.inf

    @property
    def usable_charge(self) -> float:
        """Charge that may still be taken [C]: what is left, less the part that has to stay in the pack."""
        return self.capacity * max(self.charge_left - self.lowest_charge, 0.0)


def cell_voltage(chemistry: str, charge_left: ArrayLike) -> NDArray[np.float64]:
    """Return the open-circuit voltage of one cell.

    Parameters
    ----------
    chemistry : {"lithium-polymer", "lithium-ion"}
        Names the curve.
    charge_left : array_like
        Share of the charge that is left, 0 to 1.

    Returns
    -------
    numpy.ndarray
        Voltage [V], straight lines between the curve's nodes.

    Raises
    ------
    InputError
        If the chemistry is not known.
    """
    require_one_of("chemistry", chemistry, CHEMISTRIES)
    shares, voltages = OPEN_CIRCUIT_VOLTAGE[chemistry]
    return np.interp(np.asarray(charge_left, dtype=np.float64), shares, voltages)


def charge_at_voltage(chemistry: str, voltage: ArrayLike) -> NDArray[np.float64]:
    """Return the charge left at which a cell has an open-circuit voltage: the inverse of `cell_voltage`.

    Parameters
    ----------
    chemistry : {"lithium-polymer", "lithium-ion"}
        Names the curve.
    voltage : array_like
        Of one cell [V].

    Returns
    -------
    numpy.ndarray
        Share of the charge; 0 below the curve, infinite above it.

    Raises
    ------
    InputError
        If the chemistry is not known.
    """
    require_one_of("chemistry", chemistry, CHEMISTRIES)
    shares, voltages = OPEN_CIRCUIT_VOLTAGE[chemistry]
    return np.interp(np.asarray(voltage, dtype=np.float64), voltages, shares, left=0.0, right=np.inf)
