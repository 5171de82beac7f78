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


def methods(*keys: str) -> tuple[MethodLine, ...]:
    """One line per key: text, then its source."""
    return tuple(
        MethodLine(METHODS[key].term, line(marked(METHODS[key].text), f" {METHODS[key].source}"))
        for key in keys
    )


def spending_key(spending: str) -> str:
    return spending.lower().replace("’", "'")
