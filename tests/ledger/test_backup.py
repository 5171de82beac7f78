"""A backup is verified before it takes its name, is recorded, and never takes the place of a file."""

from __future__ import annotations

import hashlib
import sqlite3
from pathlib import Path

import pytest

from app.errors import LedgerChanged, LedgerError, ValueRejected
from app.ledger.bodies import Backup
from app.ledger.database import Database
from app.ledger.entries import read_body
from app.ledger.trial import Trial
from app.settings import Settings
from tests.ledger import acts


@pytest.fixture
def to(tmp_path: Path) -> Path:
    return tmp_path / "copy.trial"


def test_a_backup_holds_the_history_up_to_its_own_entry(lived: Trial, settings: Settings, to: Path) -> None:
    before = lived.state()
    lived.back_up(to, by="M. Berg")
    with Trial.open(to, settings) as copied:
        assert copied.state() == before
        assert copied.entries() == lived.entries()[:-1]
        assert copied.snapshot(2).files == lived.snapshot(2).files
        assert copied.letter_key() == lived.letter_key()
        assert copied.check_chain((before.head.digest,)) == ()


def test_its_entry_names_the_copy_by_its_bytes(lived: Trial, to: Path) -> None:
    head = lived.state().head
    lived.back_up(to, by="M. Berg")
    digest = hashlib.sha256(to.read_bytes()).hexdigest()
    assert read_body(lived.entries()[-1]) == Backup("copy.trial", digest, head.digest, head.id, "M. Berg")


def test_one_can_go_on_from_a_backup(lived: Trial, settings: Settings, to: Path) -> None:
    lived.back_up(to, by="M. Berg")
    with Trial.open(to, settings) as copied:
        acts.live_on(copied)
        assert copied.check_chain() == ()


def test_a_backup_is_private(lived: Trial, to: Path) -> None:
    lived.back_up(to, by="M. Berg")
    assert to.stat().st_mode & 0o777 == 0o600
    assert sorted(path.name for path in to.parent.iterdir()) == ["copy.trial", "q17.trial"]


def test_no_file_is_overwritten(lived: Trial, to: Path) -> None:
    to.write_text("a letter")
    before = lived.path.read_bytes()
    with pytest.raises(ValueRejected, match="a file of that name already"):
        lived.back_up(to, by="M. Berg")
    assert to.read_text() == "a letter"
    assert lived.path.read_bytes() == before


def test_the_file_itself_is_no_place_for_its_backup(lived: Trial) -> None:
    before = lived.path.read_bytes()
    with pytest.raises(ValueRejected, match="a file of that name already"):
        lived.back_up(lived.path, by="M. Berg")
    assert lived.path.read_bytes() == before


def test_a_folder_that_is_not_there_is_told(lived: Trial, tmp_path: Path) -> None:
    with pytest.raises(ValueRejected, match="no such folder"):
        lived.back_up(tmp_path / "nowhere" / "copy.trial", by="M. Berg")


def test_a_copy_that_is_not_right_does_not_take_its_name(
    lived: Trial, to: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    copy_to = Database.copy_to

    def copy_badly(origin: Database, copy: Database) -> None:
        copy_to(origin, copy)
        copy._connection.execute("DROP TRIGGER entry_update")

    monkeypatch.setattr(Database, "copy_to", copy_badly)
    before = lived.path.read_bytes()
    with pytest.raises(LedgerChanged) as told:
        lived.back_up(to, by="M. Berg")
    assert str(told.value) == (
        f"The backup does not hold what the trial file holds in {to}. "
        "Found the rule or table 'entry_update' of the file: missing. "
        "The backup was taken away again; verify the trial file, check the disk, then repeat."
    )
    assert lived.path.read_bytes() == before
    assert list(to.parent.iterdir()) == [lived.path]


def test_a_file_open_for_reading_is_copied_without_an_entry(
    lived: Trial, settings: Settings, to: Path
) -> None:
    before = lived.path.read_bytes()
    with Trial.open(lived.path, settings, read_only=True) as reader:
        reader.back_up(to, by="M. Berg")
    assert lived.path.read_bytes() == before
    with Trial.open(to, settings) as copied:
        assert copied.state() == lived.state()


def test_a_damaged_file_is_not_copied_as_if_it_were_whole(lived: Trial, settings: Settings, to: Path) -> None:
    shell = sqlite3.connect(lived.path)
    shell.execute("DROP TRIGGER entry_update")
    shell.close()
    with (
        Trial.open(lived.path, settings) as damaged,
        pytest.raises(LedgerChanged, match="A damaged trial file is not written to"),
    ):
        damaged.back_up(to, by="M. Berg")
    assert not to.exists()


def test_no_act_comes_between_the_copy_and_its_entry(
    lived: Trial, settings: Settings, to: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    copy_to = Database.copy_to
    refused: list[str] = []

    def copy_while_another_acts(origin: Database, copy: Database) -> None:
        with Trial.open(lived.path, settings, wait_seconds=0.05) as other:
            try:
                acts.carry_out(other, acts.LATER)
            except LedgerError as told:
                refused.append(told.what)
        copy_to(origin, copy)

    monkeypatch.setattr(Database, "copy_to", copy_while_another_acts)
    lived.back_up(to, by="M. Berg")
    assert refused == ["Another program is in the middle of an act"]
    assert [entry.kind for entry in lived.entries()][-2:] == ["look frozen", "backup"]
