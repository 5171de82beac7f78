"""Plain-text tables: words left, numbers right, one blank line around."""

from __future__ import annotations

from collections.abc import Sequence


def aligned(heads: Sequence[str], rows: Sequence[Sequence[str]]) -> str:
    """The first column is set left, the others right; a rule stands under the heads."""
    widths = [max(len(line[i]) for line in (heads, *rows)) for i in range(len(heads))]
    rule = "  ".join("-" * width for width in widths)
    return "\n".join((set_row(heads, widths), rule, *(set_row(row, widths) for row in rows))) + "\n"


def set_row(cells: Sequence[str], widths: Sequence[int]) -> str:
    first, *others = zip(cells, widths, strict=True)
    right = [f"{cell:>{width}}" for cell, width in others]
    return "  ".join((f"{first[0]:<{first[1]}}", *right)).rstrip()
