"""The Data sheet: what was received, what changed, whom to ask, and what was found."""

from __future__ import annotations

from dataclasses import replace

from app.model.extract import Changes, Finding
from app.sheets.blocks import CountsFigure, Sheet
from app.sheets.extract import MOST_IDENTIFIERS, data_sheet
from tests.unit.review.invented_trial import CUTOFFS
from tests.unit.sheets.invented_looks import Held, answers, held, table_texts, text

DOUBT = Finding(
    "time-zero", "doubt", "time 0", "adtte.csv, column AVAL", "2 rows: 4, 9", "a number", "ask", (4, 9), 2
)
NOTE = replace(DOUBT, id="no-events", severity="note", what="no event yet", rows=(), count=0)


def shown(look: Held, *, changes: Changes | None = None, findings: tuple[Finding, ...] = ()) -> Sheet:
    view = look.view()
    changed = replace(view.look, changes=changes, findings=findings)
    return data_sheet(replace(view, look=changed), look.snapshot, look.extract)


def first() -> Held:
    return held(cutoffs=CUTOFFS[:1])[0]


def test_a_first_extract_says_what_it_holds() -> None:
    sheet = shown(first())
    assert answers(sheet) == [
        "The extract holds 128 subjects and 30 events and can be used; no doubt was found."
    ]
    assert isinstance(sheet.figure, CountsFigure)
    assert [(span.text, words) for span, words in sheet.figure.counts] == [
        ("128", "subjects"),
        ("30", "events"),
    ]
    assert sheet.figure_table is None


def test_doubts_are_counted_and_stand_also_when_answered() -> None:
    assert answers(shown(first(), findings=(DOUBT,)))[0].endswith("can be used; 1 doubt stands.")
    two = (DOUBT, replace(DOUBT, id="another"), NOTE)
    assert answers(shown(first(), findings=two))[0].endswith("can be used; 2 doubts stand.")


def test_findings_are_told_whole_with_their_rows() -> None:
    rows = table_texts(shown(first(), findings=(DOUBT, NOTE)), "Findings")
    sentence = "Time 0 in adtte.csv, column AVAL. Found 2 rows: 4, 9. Accepted: a number. Ask."
    assert rows["Doubt"] == [sentence, "2", ""]
    assert rows["Note"][1] == ""


CHANGES = Changes(
    n_common=120,
    new_subjects=("N1", "N2", "N3"),
    vanished_subjects=("V1",),
    new_events=("E1", "E2"),
    reversed_events=("R1",),
    moved_events=("M1", "M2"),
    changed_arm=("C1",),
    changed_stratum=("S1",),
    new_subjects_with_event=("N1",),
    vanished_with_event=("V1",),
)


def test_every_kind_of_change_is_counted_against_the_subjects_in_both() -> None:
    sheet = shown(first(), changes=CHANGES)
    assert isinstance(sheet.figure, CountsFigure)
    assert [(span.text, words) for span, words in sheet.figure.counts] == [
        ("2", "new events"),
        ("1", "reversed"),
        ("2", "moved"),
        ("1", "vanished subjects"),
        ("1", "changed arm"),
    ]
    rows = table_texts(sheet, "Changes since the last snapshot; 120 subjects in both")
    assert rows["New subjects with an event"] == ["1"]
    assert rows["Vanished subjects with an event"] == ["1"]
    assert rows["New subjects"] == ["3"]


def test_the_data_centre_is_asked_about_whom_by_identifier_but_not_about_what_is_new() -> None:
    rows = table_texts(shown(first(), changes=CHANGES), "Whom to ask")
    assert rows == {
        "Reversed": ["1", "R1"],
        "Moved": ["2", "M1, M2"],
        "Vanished subjects": ["1", "V1"],
        "Changed arm": ["1", "C1"],
        "Changed stratum": ["1", "S1"],
    }


def test_a_long_list_of_identifiers_ends_with_how_many_more() -> None:
    everyone = tuple(f"K4-{number}" for number in range(MOST_IDENTIFIERS + 5))
    rows = table_texts(shown(first(), changes=Changes(n_common=200, moved_events=everyone)), "Whom to ask")
    assert rows["Moved"][1].endswith(f"K4-{MOST_IDENTIFIERS - 1} and 5 more")


def test_nothing_changed_leaves_nobody_to_ask() -> None:
    sheet = shown(first(), changes=Changes(n_common=128))
    captions = [text(table.caption) for table in (*sheet.tables, *sheet.wide_tables, *sheet.folded)]
    assert "Endpoints in the extract" in captions
    assert "Whom to ask the data centre about" not in captions


def test_files_columns_and_endpoints_are_listed_as_read() -> None:
    sheet = shown(first())
    assert table_texts(sheet, "Files") == {"adtte-1.csv": ["128", "10"]}
    assert table_texts(sheet, "Endpoints") == {"RELAPSE": ["30 of 128"]}
    assert [text(note) for note in sheet.notes] == ["Not read, because not needed: SEX."]


def test_the_snapshot_is_shown_as_received() -> None:
    rows = table_texts(shown(first()), "As received")
    assert rows == {
        "Snapshot": ["1"],
        "Declared as": ["planned"],
        "Data cutoff": ["1 Dec 2024"],
        "Extract": ["not stated"],
        "Received": ["1 Dec 2024, 09:00 UTC"],
        "Received by": ["M. Berg"],
    }


def test_the_denominator_of_the_changes_stands_beside_them() -> None:
    assert not any("Changes" in text(note) for note in shown(first()).notes)
    second = held(cutoffs=CUTOFFS[:2])[1]
    changes = second.view().look.changes
    note = text(shown(second, changes=changes).notes[0]).replace("\u00a0", " ")
    assert note.startswith("Changes: of the 128 subjects in both snapshots. Not read")
