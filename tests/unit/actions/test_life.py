"""The life of a trial file, act by act: what each stores, what each refuses, and what is left untouched."""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import replace
from datetime import date, timedelta
from pathlib import Path

import pytest

from app.actions.check import verify
from app.actions.desk import Desk, UploadedFile
from app.actions.freeze import freeze
from app.actions.looks import closed_book, looks, record_of
from app.actions.receive import DoubtsUnanswered, receive, understand
from app.actions.report import report, write_report
from app.actions.unmask import unmask
from app.errors import AppError, InputError, LedgerError, SetupError
from app.ledger.bodies import ReportWritten, ResultsOpened
from app.ledger.entries import read_body
from app.record.canonical import digest
from app.record.schema import LOOKS_RECORD, differences
from app.review.received import SnapshotBlocked
from app.verification.check import record_in_report
from tests.unit.actions.invented_file import BY, desk, held, incoming, settings, started
from tests.unit.review.invented_trial import CUTOFFS, patients
from tests.unit.sheets.invented_looks import answers, table_texts, text


def with_time_zero(cutoff: date) -> bytes:
    """An extract with one time of 0: a doubt that wants a reason."""
    head, first, *rest = patients().at(cutoff).csv().splitlines(keepends=True)
    cells = first.split(b",")
    cells[5] = b"0"
    return b"".join([head, b",".join(cells), *rest])


def with_unknown_arm(cutoff: date) -> bytes:
    return patients().at(cutoff).csv().replace(b"SYRUPINE", b"SYRUP", 1)


# --- receive --------------------------------------------------------------------------------------------


def test_understanding_an_extract_stores_nothing_and_tells_pooled_numbers_only(tmp_path: Path) -> None:
    file = held(tmp_path, 1)
    before = file.read_bytes()
    with desk(file, 2) as open_desk:
        understood = understand(open_desk, incoming(CUTOFFS[1]))
    assert (understood.look, understood.freezes) == (2, 1)
    assert (understood.subjects, understood.events, understood.fraction) == (160, 52, 0.65)
    assert understood.changes is not None
    assert len(understood.changes.new_subjects) == 160 - 128
    assert file.read_bytes() == before


def test_receiving_opens_the_next_look(tmp_path: Path) -> None:
    file = held(tmp_path, 1)
    with desk(file, 1) as open_desk:
        assert looks(open_desk) == (1,)
        assert open_desk.trial.snapshot(1).files[0].content == patients().at(CUTOFFS[0]).csv()


def blocked(open_desk: Desk) -> None:
    given = incoming(CUTOFFS[1], content=with_unknown_arm(CUTOFFS[1]))
    receive(open_desk, given, acknowledgements={}, by=BY, freeze_open=True)


def doubtful(open_desk: Desk) -> None:
    given = incoming(CUTOFFS[1], content=with_time_zero(CUTOFFS[1]))
    receive(open_desk, given, acknowledgements={}, by=BY, freeze_open=True)


def stray_reason(open_desk: Desk) -> None:
    receive(open_desk, incoming(CUTOFFS[1]), acknowledgements={"time-zero": "Known"}, by=BY, freeze_open=True)


def while_open(open_desk: Desk) -> None:
    receive(open_desk, incoming(CUTOFFS[1]), acknowledgements={}, by=BY)


def nameless(open_desk: Desk) -> None:
    receive(open_desk, incoming(CUTOFFS[1]), acknowledgements={}, by="  ", freeze_open=True)


def cutoff_ahead(open_desk: Desk) -> None:
    receive(open_desk, incoming(CUTOFFS[3]), acknowledgements={}, by=BY, freeze_open=True)


def cutoff_before_the_last(open_desk: Desk) -> None:
    receive(open_desk, incoming(CUTOFFS[0] - timedelta(days=1)), acknowledgements={}, by=BY, freeze_open=True)


def extracted_before_its_cutoff(open_desk: Desk) -> None:
    given = replace(incoming(CUTOFFS[1]), extracted=CUTOFFS[1] - timedelta(days=1))
    receive(open_desk, given, acknowledgements={}, by=BY, freeze_open=True)


def no_file(open_desk: Desk) -> None:
    given = replace(incoming(CUTOFFS[1]), files=())
    receive(open_desk, given, acknowledgements={}, by=BY, freeze_open=True)


REFUSED: list[tuple[Callable[[Desk], None], type[AppError], str]] = [
    (
        blocked,
        SnapshotBlocked,
        "Treatment that is not an arm of the plan in adtte-2025-04-20.csv, column TRTP. Found 1 row: ",
    ),
    (doubtful, DoubtsUnanswered, "A doubt has no reason beside it. Found time-zero"),
    (
        stray_reason,
        InputError,
        "A reason is given for something that is no doubt of this extract. Found 'time-zero'",
    ),
    (while_open, LedgerError, "Look 1 is still open. Accepted: one open look at a time"),
    (nameless, InputError, "The name of who acts is missing. Accepted: 1 to 120 characters. Say who acts."),
    (
        cutoff_ahead,
        InputError,
        "A data cutoff in the future. Found 2027-01-01. Accepted: a date up to 2025-04-27.",
    ),
    (cutoff_before_the_last, InputError, "A data cutoff before the last one. Found 2024-11-30."),
    (extracted_before_its_cutoff, InputError, "An extract date that cannot be. Found 2025-04-19."),
    (no_file, SnapshotBlocked, "No file in the snapshot. Found nothing."),
]


@pytest.mark.parametrize(("act", "kind", "sentence"), REFUSED, ids=[act.__name__ for act, _, _ in REFUSED])
def test_what_is_refused_leaves_the_trial_file_byte_for_byte_as_it_was(
    tmp_path: Path, act: Callable[[Desk], None], kind: type[AppError], sentence: str
) -> None:
    file = held(tmp_path, 1)
    before = file.read_bytes()
    with desk(file, 2) as open_desk, pytest.raises(kind) as refused:
        act(open_desk)
    assert str(refused.value).startswith(sentence)
    assert file.read_bytes() == before
    assert sorted(path.name for path in tmp_path.iterdir()) == ["k4.trial"]


def test_a_doubt_is_stored_together_with_its_reason(tmp_path: Path) -> None:
    file = held(tmp_path, 1)
    given = incoming(CUTOFFS[1], content=with_time_zero(CUTOFFS[1]))
    reasons = {"time-zero": " Lost on the  day of randomisation "}
    with desk(file, 2) as open_desk:
        assert receive(open_desk, given, acknowledgements=reasons, by=BY, freeze_open=True) == 2
        (answer,) = open_desk.trial.snapshot(2).acknowledgements
        data = closed_book(open_desk, 2, session=None).sheet("data")
    assert (answer.finding_id, answer.reason) == ("time-zero", "Lost on the day of randomisation")
    assert data is not None
    assert answers(data)[0].endswith("can be used; 1 doubt stands.")
    (cells,) = [each for head, each in table_texts(data, "Findings").items() if head == "Doubt"]
    assert cells[2] == "Lost on the day of randomisation"


def test_freezing_the_open_look_and_receiving_the_next_is_one_act(tmp_path: Path) -> None:
    file = held(tmp_path, 1)
    with desk(file, 2) as open_desk:
        receive(open_desk, incoming(CUTOFFS[1]), acknowledgements={}, by=BY, freeze_open=True)
        state = open_desk.trial.state()
        assert [look.frozen is not None for look in state.looks] == [True, False]


def test_a_snapshot_that_came_in_meanwhile_is_not_overtaken(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Another window receives and leaves its look open between understanding and storing."""
    file = started(tmp_path)
    with desk(file, 2) as here, desk(file, 2) as elsewhere:
        understood = understand(here, incoming(CUTOFFS[1]))
        receive(elsewhere, incoming(CUTOFFS[0]), acknowledgements={}, by=BY)
        monkeypatch.setattr("app.actions.receive.understand", lambda *_: understood)
        with pytest.raises(LedgerError, match="Another snapshot came in meanwhile"):
            receive(here, incoming(CUTOFFS[1]), acknowledgements={}, by=BY, freeze_open=True)
        assert looks(here) == (1,)
        assert here.trial.state().open_look is not None


# --- freeze and report ----------------------------------------------------------------------------------


def test_a_freeze_keeps_report_and_full_record_under_its_entry(tmp_path: Path) -> None:
    file = held(tmp_path, 1)
    with desk(file, 1) as open_desk:
        head_before = open_desk.trial.head()
        frozen = freeze(open_desk, by=BY)
        body = open_desk.trial.state().frozen_look(1).body
        html = open_desk.trial.content(frozen.report_digest)
        full = json.loads(open_desk.trial.content(body.record_digest))
        assert frozen.head == open_desk.trial.head()
    assert digest(html) == frozen.report_digest == body.report_digest
    assert body.head_before == head_before
    assert head_before.encode() in html
    assert list(differences(full, LOOKS_RECORD)) == []
    assert full["orientation"] == {"of": "PELLETOL", "against": "SYRUPINE"}


def test_a_report_frozen_masked_carries_the_masked_record(tmp_path: Path) -> None:
    file = held(tmp_path, 2)
    with desk(file, 1) as open_desk:
        html = report(open_desk, 1).html
    record = record_in_report(html)
    assert record["orientation"] == {"of": "A", "against": "B"}
    assert list(differences(record, LOOKS_RECORD)) == []
    assert b"PELLETOL" not in html
    assert b"SYRUPINE" not in html
    assert b"elletol" not in html
    assert b"yrupine" not in html


def test_same_trial_file_look_and_time_give_the_same_report_bytes(tmp_path: Path) -> None:
    """Lived through twice from the start, with the same clock, letters and salt."""
    reports = []
    for name in ("one.trial", "other.trial"):
        with desk(held(tmp_path, 2, frozen=2, people=patients(), name=name)) as open_desk:
            reports.append([report(open_desk, look) for look in (1, 2)])
    assert reports[0] == reports[1]
    assert reports[0][0].html != reports[0][1].html


def test_a_frozen_look_is_shown_with_the_bound_as_it_was_used(tmp_path: Path) -> None:
    file = held(tmp_path, 2)
    with desk(file, 2) as open_desk:
        before = record_of(open_desk, 2)["looks"][0]
        freeze(open_desk, by=BY)
        assert record_of(open_desk, 2)["looks"][0] == before


def test_an_open_look_has_no_report_yet(tmp_path: Path) -> None:
    with desk(held(tmp_path, 1), 1) as open_desk, pytest.raises(LedgerError, match="Look 1 is not frozen"):
        report(open_desk, 1)


def test_nothing_can_be_frozen_while_no_look_is_open(tmp_path: Path) -> None:
    file = held(tmp_path, 1, frozen=1)
    before = file.read_bytes()
    with desk(file, 1) as open_desk, pytest.raises(LedgerError, match="No look is open"):
        freeze(open_desk, by=BY)
    assert file.read_bytes() == before


def test_report_files_are_written_whole_named_plainly_and_entered(tmp_path: Path) -> None:
    file = held(tmp_path, 1, frozen=1)
    with desk(file, 1) as open_desk:
        paths = write_report(open_desk, 1, tmp_path / "out" / "look-1")
        html = report(open_desk, 1).html
        last = read_body(open_desk.trial.entries()[-1])
    stem = "K4-look-1-closed-masked"
    assert [path.name for path in paths] == [
        f"{stem}.html",
        f"{stem}.record.json",
        f"{stem}.history.jsonl",
        f"{stem}.environment.json",
        "verify_report.py",
    ]
    assert paths[0].read_bytes() == html
    assert json.loads(paths[1].read_bytes()) == record_in_report(html)
    assert f"SHA-256 {digest(paths[1].read_bytes())}".encode() in html
    assert set(json.loads(paths[3].read_bytes())) == {
        "machine",
        "numpy",
        "program",
        "python",
        "scipy",
        "system",
        "vector_instructions",
    }
    assert last == ReportWritten(1, digest(html))
    assert [path.name for path in (tmp_path / "out" / "look-1").iterdir() if path.name.startswith(".")] == []


def test_a_folder_that_cannot_be_made_is_said_and_nothing_is_entered(tmp_path: Path) -> None:
    file = held(tmp_path, 1, frozen=1)
    before = file.read_bytes()
    (tmp_path / "taken").write_text("a file")
    with desk(file, 1) as open_desk, pytest.raises(SetupError, match="A report file cannot be written"):
        write_report(open_desk, 1, tmp_path / "taken" / "folder")
    assert file.read_bytes() == before


# --- unmask ---------------------------------------------------------------------------------------------


def test_after_unmasking_arms_have_names_and_the_letters_stay_with_the_patients(tmp_path: Path) -> None:
    file = held(tmp_path, 1)
    with desk(file, 1) as open_desk:
        letter = open_desk.trial.letter_key().letters.experimental
        masked = closed_book(open_desk, 1, session=None)
        unmask(open_desk, reason="The committee asked for it", by=BY)
        named = closed_book(open_desk, 1, session=None)
    assert (masked.frame.disclosure, named.frame.disclosure) == ("masked", "unmasked")
    figure = named.sheets[3].figure
    assert figure is not None
    assert figure.kind == "curves"
    assert figure.lines[0].label == f"Pelletol\u00a0({letter})"


def test_unmasking_leaves_the_report_frozen_masked_as_it_was(tmp_path: Path) -> None:
    file = held(tmp_path, 2)
    with desk(file, 2) as open_desk:
        before = report(open_desk, 1)
        unmask(open_desk, reason="The committee asked for it", by=BY)
        freeze(open_desk, by=BY)
        assert report(open_desk, 1) == before
        assert report(open_desk, 2).stem == "K4-look-2-closed-unmasked"
    assert verify(settings(CUTOFFS[3]), file).ok


def test_unmasking_needs_a_reason_and_happens_once(tmp_path: Path) -> None:
    file = held(tmp_path, 1)
    before = file.read_bytes()
    with desk(file, 1) as open_desk:
        with pytest.raises(InputError, match="The reason is missing"):
            unmask(open_desk, reason=" ", by=BY)
        assert file.read_bytes() == before
        unmask(open_desk, reason="Asked", by=BY)
        with pytest.raises(LedgerError, match="The arms are unmasked already"):
            unmask(open_desk, reason="Asked", by=BY)


def test_a_plan_that_starts_unmasked_shows_names_without_letters(tmp_path: Path) -> None:
    file = held(tmp_path, 1, changes=[("masked = true", "masked = false")])
    with desk(file, 1) as open_desk:
        book = closed_book(open_desk, 1, session=None)
    figure = book.sheets[3].figure
    assert figure is not None
    assert figure.kind == "curves"
    assert [(line.label, line.arm and line.arm.letter) for line in figure.lines] == [
        ("Pelletol", "A"),
        ("Syrupine", "B"),
    ]


# --- opening results ------------------------------------------------------------------------------------


def test_the_first_opening_of_a_look_is_recorded_once_per_session(tmp_path: Path) -> None:
    file = held(tmp_path, 2)
    with desk(file, 2) as open_desk:
        for look, session in ((1, "first"), (1, "first"), (2, "first"), (1, "second")):
            closed_book(open_desk, look, session=session)
        closed_book(open_desk, 2, session=None)
        bodies = [read_body(entry) for entry in open_desk.trial.entries()]
    opened = [(body.look, body.session, body.view) for body in bodies if isinstance(body, ResultsOpened)]
    assert opened == [(1, "first", "masked"), (2, "first", "masked"), (1, "second", "masked")]


def test_the_record_sheet_tells_the_state_in_a_sentence(tmp_path: Path) -> None:
    file = held(tmp_path, 2)
    with desk(file, 2) as open_desk:
        sheet = closed_book(open_desk, 2, session=None).sheet("record")
        assert sheet is not None
        assert answers(sheet) == ["Look 2 is open; look 1 is frozen. The arms are masked."]
        first = closed_book(open_desk, 1, session=None).sheet("record")
        assert first is not None
        assert answers(first) == [
            "Look 1 was frozen on 8 Dec 2024, 09:00 UTC, by M. Berg. The arms are masked."
        ]
        assert text(sheet.notes[-1]).endswith("this is not an electronic signature.")


def test_files_that_are_kept_and_not_read_come_back_as_they_were(tmp_path: Path) -> None:
    file = started(tmp_path)
    given = incoming(CUTOFFS[0])
    given = replace(given, files=(*given.files, UploadedFile("readme.txt", b"as sent\xff")))
    with desk(file, 1) as open_desk:
        receive(open_desk, given, acknowledgements={}, by=BY)
        assert open_desk.trial.snapshot(1).files[1].content == b"as sent\xff"
