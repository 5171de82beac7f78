"""Strict JSON into frozen dataclasses: every field there, of its type, and none unknown."""

from __future__ import annotations

from dataclasses import MISSING, fields, is_dataclass
from functools import cache
from types import UnionType
from typing import Any, Literal, get_args, get_origin, get_type_hints


def read_as(form: Any, value: Any) -> Any:
    """`value`, as strict JSON gave it, as the type `form`; ValueError says where it does not fit.

    Forms: str, int, bool, Literal, a dataclass, tuple[form, ...], dict[str, form], form | None.
    """
    origin, arguments = get_origin(form), get_args(form)
    if is_dataclass(form):
        return _read_record(form, value)
    if origin is UnionType:
        return None if value is None else read_as(arguments[0], value)
    if origin is tuple and type(value) is list:
        return tuple(read_as(arguments[0], item) for item in value)
    if origin is dict and type(value) is dict:
        return {key: read_as(arguments[1], item) for key, item in value.items()}
    if type(value) is form or (origin is Literal and value in arguments):
        return value
    raise ValueError(f"{value!r} in place of {form}")


def _read_record(form: Any, value: Any) -> Any:
    if type(value) is not dict:
        raise ValueError(f"{value!r} in place of the fields of {form.__name__}")
    forms, required = _fields(form)
    if unknown := value.keys() - forms.keys():
        raise ValueError(f"the unknown field {min(unknown)!r}")
    if missing := required - value.keys():
        raise ValueError(f"no field {min(missing)!r}")
    return form(**{name: read_as(forms[name], item) for name, item in value.items()})


@cache
def _fields(form: Any) -> tuple[dict[str, Any], frozenset[str]]:
    """The forms of the fields by name, and the names that have no default."""
    hints = get_type_hints(form)
    required = (field.name for field in fields(form) if field.default is MISSING)
    return {field.name: hints[field.name] for field in fields(form)}, frozenset(required)
