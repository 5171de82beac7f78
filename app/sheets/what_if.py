"""The question that a reader may put to the Outlook sheet, and its answer."""

from __future__ import annotations

from dataclasses import dataclass

from app.intake.answers import HIGHEST_RATIO, LOWEST_RATIO
from app.model.outlook import WhatIf
from app.model.values import Absent
from app.sheets.blocks import Row, Span
from app.sheets.outlook import power_cells
from app.sheets.words import NO_BREAK, line
from app.views.closed import ClosedView

WHAT_IF_NOT_FROZEN = f",{NO_BREAK}not{NO_BREAK}frozen"


@dataclass(frozen=True)
class WhatIfForm:
    """What is asked, what was entered, and the row that answers it or the sentence that refuses it.

    It stands beside the sheet on a page. No book of sheets has a place for it, so no report can show it.
    """

    hint: str
    entered: str = ""
    refusal: str = ""
    row: Row | None = None


def what_if_form(
    view: ClosedView, *, entered: str = "", refusal: str = "", answer: WhatIf | None = None
) -> WhatIfForm:
    row = None if answer is None else what_if_row(answer)
    return WhatIfForm(_hint(view), entered, refusal, row)


def what_if_row(asked: WhatIf) -> Row:
    """A row under the table of conditional power: for each reading its columns, as in the rows above."""
    known = (power for power in asked.readings if not isinstance(power, Absent))
    cells = tuple(cell for power in known for cell in power_cells(power))
    return Row(line(Span("What if", "strong"), WHAT_IF_NOT_FROZEN), cells, apart=True)


def _hint(view: ClosedView) -> str:
    each = "in each reading " if view.masked else ""
    return f"{each}experimental / control, from {LOWEST_RATIO:g} to {HIGHEST_RATIO:g}; never kept"
