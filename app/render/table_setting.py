"""Numbers in a column with their decimal points in line, by figure spaces after the shorter ones."""

from __future__ import annotations

import re
from collections.abc import Sequence

from app.render.svg.lettering import plain
from app.sheets.blocks import Line, Table

FIGURE_SPACE = "\u2007"
POINT_SPACE = "\u2009\u202f"  # together as wide as a point; the sans has no punctuation space
SHORT_HEAD = 18  # characters
NUMBER = re.compile(r"[−±+-]?[\d\u00a0\u202f ]*\d(?:\.(\d+))?")


def is_short(head: Line) -> bool:
    """A row head that is not broken: its column's heads give way first."""
    return len(plain(head)) <= SHORT_HEAD


def padding(texts: Sequence[str]) -> tuple[str, ...]:
    """What to set after each text so that right-aligned numbers agree at the point; words get nothing."""
    decimals = [_decimals(text) for text in texts]
    most = max((places for places in decimals if places is not None), default=0)
    return tuple(_filler(places, most) for places in decimals)


def _decimals(text: str) -> int | None:
    """Places after the point, or None when the text is not one number."""
    found = NUMBER.fullmatch(text)
    if found is None:
        return None
    return len(found.group(1) or "")


def _filler(places: int | None, most: int) -> str:
    if places is None or places == most:
        return ""
    return (POINT_SPACE if places == 0 else "") + FIGURE_SPACE * (most - places)


def column_padding(table: Table) -> tuple[tuple[str, ...], ...]:
    """Padding of every cell, by row then column; columns of words have none."""
    columns = []
    for index, column in enumerate(table.columns):
        texts = [plain(row.cells[index].line) for row in table.rows]
        columns.append(padding(texts) if column.kind == "numbers" else ("",) * len(texts))
    return tuple(tuple(column[row] for column in columns) for row in range(len(table.rows)))
