"""A record as text: JSON a person can read and any program can parse, the same bytes every time."""

from __future__ import annotations

import json
from typing import Any


def record_bytes(record: dict[str, Any]) -> bytes:
    """UTF-8 JSON in the record's own key order; doubles as the shortest text that reads back to them."""
    return (_laid_out(record, "") + "\n").encode("utf-8")


def _laid_out(value: Any, margin: str) -> str:
    """Objects and lists of objects over several lines; a list of plain values on one."""
    inner = margin + " "
    if isinstance(value, dict) and value:
        lines = [f"{inner}{_plain(key)}: {_laid_out(item, inner)}" for key, item in value.items()]
        return "{\n" + ",\n".join(lines) + f"\n{margin}}}"
    if isinstance(value, list) and any(isinstance(item, dict) and len(item) > 1 for item in value):
        return "[\n" + ",\n".join(inner + _laid_out(item, inner) for item in value) + f"\n{margin}]"
    return _plain(value)


def _plain(value: Any) -> str:
    return json.dumps(value, ensure_ascii=False, allow_nan=False)
