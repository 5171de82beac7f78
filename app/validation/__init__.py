"""Published check values, kept once: the tests run them, and so does the `validate` command.

Each module of rows has a function that returns them; a new one is added to `SOURCES`.
"""

from __future__ import annotations

from app.validation.design_rows import design_rows
from app.validation.family_rows import family_rows
from app.validation.outlook_rows import outlook_rows
from app.validation.rows import PublishedRow, RowOutcome
from app.validation.sequential_rows import sequential_rows
from app.validation.shape_rows import shape_rows
from app.validation.survival_rows import survival_rows

SOURCES = (survival_rows, shape_rows, sequential_rows, family_rows, design_rows, outlook_rows)

__all__ = ["PublishedRow", "RowOutcome", "published_rows"]


def published_rows() -> tuple[PublishedRow, ...]:
    """Every row of every source, in the order of the sources."""
    return tuple(row for source in SOURCES for row in source())
