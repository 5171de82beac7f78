"""Canonical JSON: one value, one sequence of bytes, so that a digest means something.

The form is RFC 8785 (JSON Canonicalization Scheme): keys sorted by their UTF-16 code units, no white space,
strings escaped as little as JSON allows, UTF-8. One thing differs: a float is written as a string that holds
the shortest decimal naming the same double (Python's repr), because number printing is what JSON libraries
disagree about. Whoever knows that a field is a float reads it back with float(), exactly.
"""

from __future__ import annotations

import hashlib
import json
import math
from collections.abc import Iterable
from typing import Any

from app.errors import ValueRejected

LARGEST_INTEGER = (
    2**53 - 1
)  # RFC 7493 (I-JSON), section 2.2: beyond it a double no longer tells neighbours apart


def canonical_bytes(value: Any) -> bytes:
    """`value` (None, bool, int, float, str, list, tuple, dict) as canonical JSON.

    Raises
    ------
    ValueError, TypeError : NaN, an infinity, an integer beyond 2^53 - 1, half a surrogate pair, another type:
        bugs in the caller, since facts about the data never come as NaN.
    """
    text = json.dumps(_plain(value), ensure_ascii=False, allow_nan=False, separators=(",", ":"))
    return text.encode("utf-8")


def digest(content: bytes) -> str:
    """SHA-256 in lower-case hex."""
    return hashlib.sha256(content).hexdigest()


def parse_strict(content: bytes, where: str = "the JSON text") -> Any:
    """Read JSON that has one meaning only; what other readers let pass is told as ValueRejected.

    Refused: bytes that are not UTF-8, NaN and infinities (1e999 too), a key given twice, an integer beyond
    2^53 - 1, half a surrogate pair, nesting deeper than the reader goes.
    """
    try:
        value = json.loads(
            content.decode("utf-8"),
            object_pairs_hook=_object_without_repeats,
            parse_constant=_refuse_constant,
            parse_float=_finite_float,
            parse_int=_exact_integer,
        )
        if b"\\ud" in content.lower():
            _refuse_half_pairs(value)
    except RecursionError as fault:
        raise _rejected(where, "brackets nested too deeply") from fault
    except ValueError as fault:  # also json.JSONDecodeError and UnicodeDecodeError
        raise _rejected(where, str(fault)) from fault
    return value


def _plain(value: Any) -> Any:
    """The same value with floats as strings and keys in canonical order."""
    if value is None or isinstance(value, bool | str):
        return value
    if isinstance(value, int):
        return _within_exact_range(value)
    if isinstance(value, float):
        return _float_text(value)
    if isinstance(value, list | tuple):
        return [_plain(item) for item in value]
    if isinstance(value, dict):
        return {key: _plain(value[key]) for key in sorted(value, key=_utf16)}
    raise TypeError(f"canonical JSON has no form for {type(value).__name__}")


def _utf16(key: str) -> bytes:
    if not isinstance(key, str):
        raise TypeError(f"a key of canonical JSON is a string, not {key!r}")
    return key.encode("utf-16-be")


def _float_text(value: float) -> str:
    if not math.isfinite(value):
        raise ValueError(f"canonical JSON has no form for {value!r}")
    return float.__repr__(value)  # numpy's float64 is a float with a repr of its own


def _within_exact_range(value: int) -> int:
    if abs(value) > LARGEST_INTEGER:
        raise ValueError("an integer beyond 2^53 - 1")
    return int(value)


def _object_without_repeats(pairs: Iterable[tuple[str, Any]]) -> dict[str, Any]:
    result: dict[str, Any] = {}
    for key, value in pairs:
        if key in result:
            raise ValueError(f"the key {key!r} twice in one object")
        result[key] = value
    return result


def _refuse_constant(name: str) -> None:
    raise ValueError(name)


def _finite_float(text: str) -> float:
    value = float(text)
    if not math.isfinite(value):
        raise ValueError(f"{text}, which no double holds")
    return value


def _exact_integer(text: str) -> int:
    if len(text) > 17:  # longer than -9007199254740991; int() itself gives up on thousands of digits
        raise ValueError("an integer beyond 2^53 - 1")
    return _within_exact_range(int(text))


def _refuse_half_pairs(value: Any) -> None:
    try:
        json.dumps(value, ensure_ascii=False).encode("utf-8")
    except UnicodeEncodeError as fault:
        raise ValueError("half a surrogate pair, which is no character") from fault


def _rejected(where: str, found: str) -> ValueRejected:
    return ValueRejected(
        "Text that is not strict JSON",
        where=where,
        found=found,
        accepted="UTF-8 JSON with each key once and only finite numbers",
        remedy="write the text again with the program that made it",
    )
