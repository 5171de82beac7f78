"""All sheets of one look, in the order the committee asks."""

from __future__ import annotations

from app.model.extract import Extract, Finding, Snapshot
from app.sheets.blocks import LookBook, Sheet
from app.sheets.boundary import boundary_sheet
from app.sheets.curves import curves_sheet, open_curves_sheet
from app.sheets.extract import data_sheet, open_data_sheet
from app.sheets.frame import Surroundings, closed_frame, open_frame
from app.sheets.glance import glance_sheet, open_glance_sheet
from app.sheets.information import information_sheet, open_information_sheet
from app.sheets.outlook import outlook_sheet
from app.sheets.record import History, record_sheet, state_sentence
from app.sheets.shape import shape_sheet
from app.views.closed import ClosedView
from app.views.open import OpenView


def closed_book(
    view: ClosedView,
    around: Surroundings,
    snapshot: Snapshot,
    extract: Extract,
    history: History,
    plan_doubts: tuple[Finding, ...] = (),
) -> LookBook:
    """`plan_doubts` are of the plan that the look is held under, by itself."""
    number = view.look.number
    sheets = (
        glance_sheet(view, around, state_sentence(history, number)),
        data_sheet(view, snapshot, extract),
        information_sheet(view, around.planned_for(number)),
        curves_sheet(view),
        boundary_sheet(view),
        shape_sheet(view),
        outlook_sheet(view),
        record_sheet(history, number, plan_doubts),
    )
    return LookBook(closed_frame(view, around, _named(sheets)), sheets)


def open_book(view: OpenView, around: Surroundings) -> LookBook:
    sheets = (
        open_glance_sheet(view, around),
        open_data_sheet(view),
        open_information_sheet(view, around.planned_for(view.look.number)),
        open_curves_sheet(view),
    )
    return LookBook(open_frame(view, around, _named(sheets)), sheets)


def _named(sheets: tuple[Sheet, ...]) -> tuple[tuple[str, int | None, str], ...]:
    return tuple((sheet.key, sheet.number, sheet.name) for sheet in sheets)
