"""A question put to a look of a trial file: answered, refused, or left alone where nothing is to come."""

from __future__ import annotations

from pathlib import Path

from app.actions.what_if import ask_what_if
from tests.unit.actions.invented_file import desk, held
from tests.unit.sheets.invented_looks import text


def test_a_question_is_answered_or_refused_and_the_file_stays_as_it_is(tmp_path: Path) -> None:
    file = held(tmp_path, 2)
    before = file.read_bytes()
    with desk(file, 1) as open_desk:
        answered = ask_what_if(open_desk, 1, "0,8")
        refused = ask_what_if(open_desk, 1, "half")
        asked_nothing = ask_what_if(open_desk, 1, "")
    assert answered.row is not None
    assert text(answered.row.cells[0].line) == "0.800"
    assert (refused.row, refused.entered) == (None, "half")
    assert refused.refusal.startswith("This is no hazard ratio in the what-if question. Found 'half'.")
    assert (asked_nothing.row, asked_nothing.refusal) == (None, "")
    assert file.read_bytes() == before


def test_where_no_look_is_to_come_nothing_is_asked(tmp_path: Path) -> None:
    """Over-running, no later look tests anything: neither a ratio nor a slip of the pen is answered."""
    with desk(held(tmp_path, 4)) as open_desk:
        for entered in ("0.8", "half"):
            form = ask_what_if(open_desk, 4, entered)
            assert (form.row, form.refusal) == (None, "")
