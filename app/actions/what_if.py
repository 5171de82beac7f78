"""Ask what conditional power would be under a hazard ratio of one's own. It reads, and keeps nothing."""

from __future__ import annotations

from app.actions.desk import Desk
from app.actions.looks import view_of
from app.errors import InputError
from app.intake.answers import read_hazard_ratio
from app.sheets.outlook import going_on
from app.sheets.what_if import WhatIfForm, what_if_form
from app.views.what_if import what_if

FIELD = "the what-if question"


def ask_what_if(desk: Desk, look: int, entered: str) -> WhatIfForm:
    """The form beside the Outlook sheet of a look, with the answer to what was entered, or its refusal.

    Where no look is to come in any reading, nothing is asked, and nothing answered.
    """
    view = view_of(desk, look)
    if not entered or not going_on(view):
        return what_if_form(view)
    try:
        hazard_ratio = read_hazard_ratio(entered, where=FIELD)
    except InputError as refusal:
        return what_if_form(view, entered=entered, refusal=str(refusal))
    return what_if_form(view, entered=entered, answer=what_if(view, hazard_ratio))
