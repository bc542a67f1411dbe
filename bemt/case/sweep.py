"""Checking [sweep]: whether every name stands for a number of the case and every value fits it."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Annotated, Any, get_args, get_origin

from pydantic import BaseModel, TypeAdapter, ValidationError
from pydantic.fields import FieldInfo

from bemt.case.complaints import did_you_mean
from bemt.case.lines import Path as KeyPath
from bemt.case.models import BLADE_OPERATIONS, CaseFile
from bemt.case.schema import Complain

_SETTINGS = ("bounds", "keep")
_POINTS = ("static", "cruise", "best_endurance", "best_range", "best_climb", "top_speed", "hover")


def check_sweep(sweep: Mapping[str, Any], complain: Complain) -> None:
    """Check the names and values of a [sweep] that has the right form.

    Parameters
    ----------
    sweep : mapping
        As parsed from the file.
    complain : callable
        Takes the path of a key and what is wrong with it.
    """
    known = _numbers()
    for name, values in sweep.items():
        if name in _SETTINGS:
            continue
        path: KeyPath = ("sweep", name)
        if name not in known:
            complain(path, f"no number of the case has this name{did_you_mean(name, known)}")
            continue
        listed = values if isinstance(values, list) else [values["from"], values["to"]]
        steps: list[int | str] = list(range(len(values))) if isinstance(values, list) else ["from", "to"]
        for step, value in zip(steps, listed, strict=True):
            message = _misfit(known[name], value)
            if message:
                complain((*path, step), message)
    keep = sweep.get("keep", {}).get("quantities", [])
    names: list[tuple[KeyPath, str]] = [(("sweep", "bounds", name), name) for name in sweep.get("bounds", {})]
    names += [(("sweep", "keep", "quantities", index), name) for index, name in enumerate(keep)]
    for place, name in names:
        point, dot, quantity = name.partition(".")
        if not dot or not quantity:
            complain(place, f"{name!r} must be a named point and a quantity, such as static.thrust")
        elif point not in _POINTS:
            complain(place, f"{point!r} is no named point{did_you_mean(point, _POINTS)}; one of {', '.join(_POINTS)}")


def _numbers() -> dict[str, Any]:
    """Return the type of every number of the case by its dotted name."""
    found = dict(BLADE_OPERATIONS)
    for section, info in CaseFile.model_fields.items():
        model = _optional(info.annotation)
        if section in ("sweep", "correction", "uncertainty") or not _is_model(model):
            continue
        for name, field in model.model_fields.items():
            kind = _optional(field.annotation)
            if kind in (int, float) or _is_annotated_number(kind):
                found[f"{section}.{name}"] = _full_type(kind, field)
            elif _is_model(kind):
                for inner, number in kind.model_fields.items():
                    if _optional(number.annotation) in (int, float):
                        found[f"{section}.{name}.{inner}"] = _full_type(_optional(number.annotation), number)
    found["airframe.drag.cd0"] = found["airframe.drag.k"] = float
    return found


def _is_model(kind: Any) -> bool:
    return isinstance(kind, type) and issubclass(kind, BaseModel)


def _optional(annotation: Any) -> Any:
    """Return what is left of an annotation without its None."""
    parts = [part for part in get_args(annotation) if part is not type(None)]
    return parts[0] if len(parts) == 1 and type(None) in get_args(annotation) else annotation


def _is_annotated_number(kind: Any) -> bool:
    return get_origin(kind) is Annotated and get_args(kind)[0] in (int, float)


def _full_type(kind: Any, field: FieldInfo) -> Any:
    return Annotated[(kind, *field.metadata)] if field.metadata else kind


def _misfit(kind: Any, value: object) -> str:
    try:
        TypeAdapter(kind).validate_python(value, strict=True)
    except ValidationError as error:
        details = error.errors(include_url=False)[0]
        if details["type"] == "value_error":
            return str(details["ctx"]["error"])
        return f"{value!r}: {details['msg'][0].lower()}{details['msg'][1:]}"
    return ""
