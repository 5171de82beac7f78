"""Plain-text tables: words left, numbers right with their points in line."""

from __future__ import annotations

import re
from collections.abc import Sequence


def aligned(heads: Sequence[str], rows: Sequence[Sequence[str]]) -> str:
    """The first column is set left, the others right; a rule stands under the heads."""
    names, *columns = zip(*rows, strict=True)
    lines = list(zip(names, *map(points_in_line, columns), strict=True))
    widths = [max(len(cells[i]) for cells in (heads, *lines)) for i in range(len(heads))]
    rule = "  ".join("-" * width for width in widths)
    return "\n".join((set_row(heads, widths), rule, *(set_row(cells, widths) for cells in lines))) + "\n"


def points_in_line(cells: Sequence[str]) -> list[str]:
    """Each number with blanks after it in place of the decimals that it has fewer than others."""
    decimals = [
        len(found[1] or "") if (found := re.fullmatch(r"-?\d+(\.\d+)?", cell)) else 0 for cell in cells
    ]
    return [cell + " " * (max(decimals) - places) for cell, places in zip(cells, decimals, strict=True)]


def set_row(cells: Sequence[str], widths: Sequence[int]) -> str:
    (name, width), *others = zip(cells, widths, strict=True)
    return "  ".join((f"{name:<{width}}", *(f"{cell:>{room}}" for cell, room in others))).rstrip()
