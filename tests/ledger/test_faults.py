"""Faults of the disk and of SQLite reach a person as one sentence, and nothing is lost or half stored."""

from __future__ import annotations

import os
import shutil
import sqlite3
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import pytest

from app.errors import AppError, LedgerChanged, LedgerError, SetupError, ValueRejected
from app.ledger.database import Database
from app.ledger.faults import BY_RESULT, told
from app.ledger.trial import Trial
from app.settings import Settings
from tests.ledger import acts

ROOT = Path(__file__).resolve().parents[2]


def another_database(path: Path) -> None:
    with sqlite3.connect(path) as connection:
        connection.execute("CREATE TABLE recipe (name)")
    connection.close()


@pytest.mark.parametrize(
    "make",
    [
        lambda path: path.write_bytes(b""),
        lambda path: path.write_bytes(b"USUBJID,AVAL,CNSR\n1,2,0\n" * 500),
        another_database,
    ],
    ids=["empty", "text", "another database"],
)
def test_a_file_of_another_kind_is_told(path: Path, settings: Settings, make: Callable[[Path], None]) -> None:
    make(path)
    before = path.read_bytes()
    with pytest.raises(ValueRejected) as refused:
        Trial.open(path, settings)
    assert str(refused.value) == (
        f"There is no trial in {path}. Found a file of another kind. "
        "Accepted: a trial file that this program made. Name the right file, or start a new one."
    )
    assert path.read_bytes() == before


@pytest.mark.parametrize("make", [lambda path: None, Path.mkdir], ids=["nothing", "folder"])
def test_a_path_without_a_file_is_told(path: Path, settings: Settings, make: Callable[[Path], None]) -> None:
    make(path)
    with pytest.raises(ValueRejected) as refused:
        Trial.open(path, settings)
    assert str(refused.value) == (
        f"There is no trial file in {path}. Found no file of that name. Accepted: the path of a trial file. "
        "Name the right file, or start a new one."
    )
    assert not path.is_file()


def test_a_file_of_a_newer_version_is_told(lived: Trial, settings: Settings) -> None:
    lived._database.run("PRAGMA user_version = 99")
    before = lived.path.read_bytes()
    with pytest.raises(LedgerError) as refused:
        Trial.open(lived.path, settings)
    assert str(refused.value) == (
        f"The trial file was written by a newer version of this program in {lived.path}. Found schema 99. "
        "Accepted: schemas up to 2. Open it with the newer version; nothing was changed."
    )
    assert lived.path.read_bytes() == before


def test_another_program_in_the_middle_of_an_act_is_told(trial: Trial, settings: Settings) -> None:
    with Trial.open(trial.path, settings, wait_seconds=0.05) as waiting, trial.act() as act:
        acts.receive(act, 1)
        with pytest.raises(LedgerError) as refused, waiting.act():
            pass
        assert waiting.state().looks == ()  # reading goes on meanwhile
    assert str(refused.value) == (
        f"Another program is in the middle of an act in {trial.path}. "
        "Found a lock that did not open in time. "
        "Nothing of this act was stored; let the other finish or end it, then repeat."
    )
    assert len(trial.state().looks) == 1


def test_two_processes_take_turns_and_neither_loses_an_act(trial: Trial) -> None:
    with trial.act() as act:
        acts.receive(act, 1)
    others = [
        subprocess.Popen([sys.executable, "-c", OPENS_RESULTS, str(trial.path), name], cwd=ROOT)
        for name in "ab"
    ]
    assert [other.wait(timeout=60) for other in others] == [0, 0]
    assert len(trial.state().openings) == 40
    assert trial.check_chain() == ()


OPENS_RESULTS = """
import sys
from pathlib import Path
from app.ledger.trial import Trial
from tests.ledger import acts
with Trial.open(Path(sys.argv[1]), acts.ticking_settings(), wait_seconds=30) as trial:
    for number in range(20):
        with trial.act() as act:
            acts.open_results(act, 1, session=f"{sys.argv[2]} {number}")
"""


def test_an_act_waits_for_a_reader_and_fails_whole(trial: Trial, settings: Settings) -> None:
    with Trial.open(trial.path, settings, wait_seconds=0.05) as writer, trial._database.reading():
        trial._database.run("SELECT * FROM entry")
        with pytest.raises(LedgerError, match="in the middle of an act"), writer.act() as act:
            acts.receive(act, 1)
    with Trial.open(trial.path, settings) as writer:
        assert writer.state().looks == ()
        acts.live(writer)
        assert writer.check_chain() == ()


def test_a_full_disk_is_told_and_the_act_leaves_nothing(trial: Trial) -> None:
    n_pages = trial._database.value("PRAGMA page_count")
    trial._database.run(f"PRAGMA max_page_count = {n_pages}")
    with pytest.raises(SetupError) as refused, trial.act() as act:
        acts.receive(act, 1)
    assert str(refused.value) == (
        f"No room is left for writing in {trial.path}. Found database or disk is full. "
        "Accepted: free space of twice the files received. "
        "Nothing of this act was stored; make room and repeat it."
    )
    trial._database.run("PRAGMA max_page_count = 1000000")
    acts.live(trial)
    assert trial.check_chain() == ()


@pytest.mark.parametrize(
    "vanish", [Path.unlink, lambda path: path.rename(f"{path}.old")], ids=["gone", "moved"]
)
def test_a_path_that_vanished_is_told(trial: Trial, vanish: Callable[[Path], None]) -> None:
    vanish(trial.path)
    with pytest.raises(LedgerError) as refused, trial.act() as act:
        acts.receive(act, 1)
    assert str(refused.value) == (
        f"The opened trial file is no longer found in {trial.path}. Found a file that was moved, removed or "
        "replaced since it was opened. Accepted: the file that was opened. Nothing of this act was stored; "
        "put the file back, or open it in its new place."
    )


def test_a_file_put_in_the_place_of_the_open_one_is_told(trial: Trial, a_life: bytes) -> None:
    other = trial.path.with_name("other")
    other.write_bytes(a_life)
    other.replace(trial.path)
    with pytest.raises(LedgerError, match="moved, removed or replaced"), trial.act() as act:
        acts.receive(act, 1)
    assert trial.path.read_bytes() == a_life


def test_a_file_that_may_not_be_written_opens_for_reading(
    lived: Trial, settings: Settings, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("os.access", lambda path, mode: mode != os.W_OK)  # root may write anywhere
    with Trial.open(lived.path, settings) as reader:
        assert reader.read_only
        assert reader.check_chain() == ()


def test_writing_through_a_connection_for_reading_is_told(lived: Trial) -> None:
    reader = Database(lived.path, read_only=True, wait_seconds=1)
    with pytest.raises(SetupError, match="No permission to write in"):
        reader.run("INSERT INTO content VALUES ('digest', x'00')")
    reader.close()


def test_corrupted_pages_are_told(lived: Trial, settings: Settings) -> None:
    content = bytearray(lived.path.read_bytes())
    for page in range(1, len(content) // 4096):
        content[page * 4096 : page * 4096 + 8] = b"\xff" * 8
    lived.path.write_bytes(content)
    with Trial.open(lived.path, settings) as trial:
        assert trial.read_only
        assert any("Damaged pages in" in str(problem) for problem in trial.damage)
        with pytest.raises(LedgerChanged, match=r"Damaged pages in .* Nothing was written"):
            trial.entries()
    assert lived.path.read_bytes() == content


def test_a_file_cut_short_is_told(lived: Trial, settings: Settings) -> None:
    content = lived.path.read_bytes()
    lived.path.write_bytes(content[: len(content) // 2])
    with pytest.raises(LedgerChanged, match=r"Damaged pages in .* go back to a backup"):
        Trial.open(lived.path, settings)
    assert lived.path.read_bytes() == content[: len(content) // 2]


def test_every_fault_that_sqlite_can_report_has_a_sentence() -> None:
    results = [name for name in dir(sqlite3) if name.startswith("SQLITE_")]
    assert len(results) > 100
    for name in (*results, ""):
        fault = sqlite3.OperationalError("some detail")
        fault.sqlite_errorname = name
        assert isinstance(told(fault, Path("q17.trial")), AppError)
        assert str(told(fault, Path("q17.trial"))).endswith(".")


def test_the_longest_beginning_of_a_result_decides() -> None:
    fault = sqlite3.OperationalError("attempt to write a readonly database")
    fault.sqlite_errorname = "SQLITE_READONLY_DIRECTORY"
    assert told(fault, Path("q17.trial")).what == BY_RESULT["SQLITE_READONLY"].what


def test_a_copy_taken_while_the_trial_is_open_is_whole(trial: Trial, settings: Settings) -> None:
    copy = trial.path.with_name("copy.trial")
    acts.live(trial, until="unmask")
    shutil.copy(trial.path, copy)
    with Trial.open(copy, settings) as copied:
        assert copied.check_chain() == ()
        assert copied.state() == trial.state()


def test_a_copy_taken_within_an_act_is_the_file_before_the_act(trial: Trial, settings: Settings) -> None:
    copy = trial.path.with_name("copy.trial")
    before = trial.state()
    with trial.act() as act:
        received = acts.snapshot(1)
        act.store(b"x" * 20_000_000)  # more than SQLite's cache, which would otherwise spill into the file
        acts.receive(act, 1)
        shutil.copy(trial.path, copy)
        act._not_named.clear()
    with Trial.open(copy, settings) as copied:
        assert copied.check_chain() == ()
        assert copied.state() == before
    assert trial.snapshot(1).files == received.files


def test_a_file_turned_to_another_journal_is_turned_back(lived: Trial, settings: Settings) -> None:
    lived.close()
    shell = sqlite3.connect(lived.path)
    shell.execute("PRAGMA journal_mode = WAL")
    shell.close()
    with Trial.open(lived.path, settings) as trial:
        assert trial._database.value("PRAGMA journal_mode") == "delete"
        with trial.act() as act:
            acts.open_results(act, 2)
    assert list(lived.path.parent.iterdir()) == [lived.path]


@pytest.mark.parametrize(
    ("name", "value"), [("foreign_keys", 1), ("trusted_schema", 0), ("synchronous", 3), ("cache_spill", 0)]
)
def test_the_connection_is_set_up_for_safety(trial: Trial, name: str, value: int) -> None:
    assert trial._database.value(f"PRAGMA {name}") == value


@pytest.mark.parametrize(
    "name", ["q 17.trial", "q17?mode=memory.trial", "q17#1.trial", "100%.trial", "é.trial"]
)
def test_any_file_name_will_do(tmp_path: Path, settings: Settings, name: str) -> None:
    with acts.start(tmp_path / name, settings) as trial:
        acts.live(trial)
    assert [path.name for path in tmp_path.iterdir()] == [name]
