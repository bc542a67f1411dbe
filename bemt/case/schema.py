"""Checking a parsed case file against the schema, section by section, and wording what does not fit."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from types import UnionType
from typing import Any, Union, get_args, get_origin

from pydantic import BaseModel, TypeAdapter, ValidationError
from pydantic.fields import FieldInfo
from pydantic_core import ErrorDetails

from bemt.case.complaints import did_you_mean, nearest
from bemt.case.lines import Path as KeyPath
from bemt.case.models import CaseFile

Complain = Callable[[KeyPath, str], None]

_KINDS = {
    "string_type": "text in quotes",
    "float_type": "a number",
    "int_type": "a whole number",
    "int_from_float": "a whole number",
    "bool_type": "true or false",
    "list_type": "a list",
    "dict_type": "a table",
    "model_type": "a table",
    "model_attributes_type": "a table",
}
_LATE_SECTIONS = ("sweep", "correction", "uncertainty")
_COMPARISONS = {
    "greater_than": ("more than", "gt"),
    "greater_than_equal": ("at least", "ge"),
    "less_than": ("less than", "lt"),
    "less_than_equal": ("at most", "le"),
}


def check_keys(document: Mapping[str, Any], complain: Complain) -> dict[str, Any]:
    """Validate every section by itself, so that a mistake in one does not hide those in another.

    Parameters
    ----------
    document : mapping
        A parsed case file.
    complain : callable
        Takes the path of a key and what is wrong with it.

    Returns
    -------
    dict of str to object
        Validated sections by name, defaults included; without those that have complaints.
    """
    for key in document:
        if key not in CaseFile.model_fields:
            complain((key,), _unknown((key,), CaseFile, "section"))
    valid: dict[str, Any] = {}
    for name, info in CaseFile.model_fields.items():
        if name not in document:
            if info.is_required():
                complain((), f"the section [{name}] is missing")
            else:
                valid[name] = info.get_default(call_default_factory=True)
            continue
        try:
            valid[name] = _adapter(info).validate_python(document[name], strict=True)
        except ValidationError as error:
            mistakes = error.errors(include_url=False)
            misspelt = {_meant(_path(details, name)) for details in mistakes if details["type"] == "extra_forbidden"}
            for details in mistakes:
                if details["type"] != "missing" or _path(details, name) not in misspelt:
                    complain(*_worded(details, name))
    return valid


def unknown_keys(path: KeyPath, table: Mapping[str, Any]) -> list[str]:
    """Return the keys of a table that the schema does not have.

    Parameters
    ----------
    path : tuple of str or int
        Of the table.
    table : mapping
        As parsed.

    Returns
    -------
    list of str
    """
    return sorted(set(table) - set(_keys(_model_at(path))))


def _adapter(info: FieldInfo) -> TypeAdapter[Any]:
    kind: Any = info.annotation
    return TypeAdapter(kind)


def _path(details: ErrorDetails, section: str) -> KeyPath:
    # Tags of alternatives stand in the validator's path and not in the file.
    return (section, *(step for step in details["loc"] if not str(step).startswith("<")))


def _meant(path: KeyPath) -> KeyPath:
    """Return the path that a misspelt key probably stands for."""
    return (*path[:-1], nearest(str(path[-1]), _keys(_model_at(path[:-1]))) or "")


def _keys(model: type[BaseModel] | None) -> list[str]:
    return [] if model is None else [info.alias or name for name, info in model.model_fields.items()]


def _worded(details: ErrorDetails, section: str) -> tuple[KeyPath, str]:
    """Return path and message of one error of the validator."""
    path = _path(details, section)
    kind, context, value = details["type"], details.get("ctx", {}), details["input"]
    if kind == "extra_forbidden":
        return path, _unknown(path, _model_at(path[:-1]), "key")
    if kind == "missing":
        return path, f"is missing{_expected(path)}"
    if kind == "value_error":
        return path, str(context["error"])
    if kind == "literal_error":
        expected = str(context["expected"])
        known = [word.strip("'") for word in expected.replace(" or ", ", ").split(", ")]
        return path, f"{_shown(value)}{did_you_mean(str(value), known)} does not fit; one of {', '.join(known)}"
    if kind == "union_tag_not_found":
        wanted = "{ cd0, k } or the name of a CSV file" if path[-1] == "drag" else "a list or { from, to, count }"
        return path, f"{_shown(value)} must be {wanted}"
    if kind in _COMPARISONS:
        words, bound = _COMPARISONS[kind]
        return path, f"{_shown(value)} must be {words} {context[bound]:g}"
    if kind == "finite_number":
        return path, f"{_shown(value)} is not a finite number"
    if kind in ("too_short", "too_long"):
        words, bound = ("at least", "min_length") if kind == "too_short" else ("at most", "max_length")
        return path, f"holds {context['actual_length']}; {words} {context[bound]} fit"
    if kind == "string_too_short":
        return path, "is empty"
    if kind == "list_type" and isinstance(value, Mapping):
        return path, f"must be a list of tables: write [[{path[-1]}]] with double brackets"
    if kind in _KINDS:
        return path, f"{_shown(value)} must be {_KINDS[kind]}"
    return path, details["msg"]


def _shown(value: object) -> str:
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, Mapping):
        return "a table"
    if isinstance(value, list):
        return "a list"
    return repr(value)[:60]


def _unknown(path: KeyPath, model: type[BaseModel] | None, what: str) -> str:
    """Say that a key is unknown, and which one may have been meant or where it belongs."""
    key = str(path[-1])
    known = _keys(model)
    guess = did_you_mean(key, known)
    if not guess:
        homes = [
            name
            for name, info in CaseFile.model_fields.items()
            if (inner := _model_of(info)) is not None
            and key in inner.model_fields
            and name not in (path[0], *_LATE_SECTIONS)
        ]
        guess = f" (it belongs in [{homes[0]}])" if len(homes) == 1 else ""
    return f"unknown {what}{guess}; known ones: {', '.join(known)}" if known else f"unknown {what}{guess}"


def _expected(path: KeyPath) -> str:
    """Return an example of what is missing, from the schema."""
    model = _model_at(path[:-1])
    if model is None:
        return ""
    for name, info in model.model_fields.items():
        if (info.alias or name) == path[-1]:
            units = [meta.kind for meta in info.metadata if hasattr(meta, "kind")]
            return f': a {units[0].name}, such as {path[-1]} = "1.5 {units[0].fitting[0]}"' if units else ""
    return ""


def _model_at(path: KeyPath) -> type[BaseModel] | None:
    """Return the model of the table at a path."""
    model: type[BaseModel] | None = CaseFile
    for step in path:
        if isinstance(step, int):
            continue
        if model is None:
            return None
        for name, info in model.model_fields.items():
            if (info.alias or name) == step:
                model = _model_of(info)
                break
        else:
            return None
    return model


def _model_of(info: FieldInfo) -> type[BaseModel] | None:
    return _first_model(info.annotation)


def _first_model(annotation: Any) -> type[BaseModel] | None:
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    if get_origin(annotation) in (Union, UnionType, list, dict) or hasattr(annotation, "__metadata__"):
        for part in get_args(annotation):
            found = _first_model(part)
            if found is not None:
                return found
    return None
