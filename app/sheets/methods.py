""" "How this was computed": entries of app/methods set as lines."""

from __future__ import annotations

from app.methods import METHODS
from app.sheets.blocks import Line, MethodLine, Span
from app.sheets.words import line


def marked(text: str) -> Line:
    """Plain text with symbols between asterisks, as a line."""
    return tuple(
        Span(part, "symbol" if index % 2 else "plain") for index, part in enumerate(text.split("*")) if part
    )


def methods(*keys: str, masked: bool = False) -> tuple[MethodLine, ...]:
    """One line per key: text, then its source; `masked` where arms are letters."""
    entries = (METHODS[key] for key in keys)
    return tuple(
        MethodLine(entry.term, line(marked((masked and entry.masked) or entry.text), f" {entry.source}"))
        for entry in entries
    )


def spending_key(spending: str) -> str:
    return spending.lower().replace("’", "'")
