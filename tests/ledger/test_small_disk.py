"""A full and a read-only disk, for real: a file system of one megabyte, mounted for each test."""

from __future__ import annotations

import shutil
from collections.abc import Callable
from pathlib import Path

import pytest

from app.errors import SetupError
from app.ledger.trial import Trial
from app.settings import Settings
from tests.conftest import SmallDisk
from tests.ledger import acts

DEEDS = {**acts.LIFE, **acts.LATER}
PAGE = 4096


def with_less_and_more_room(disk: SmallDisk, do: Callable[[], None]) -> int:
    """Try with 0, 1, 2... pages of room until it is done; how often the disk was too small."""
    for n_pages in range(256):
        disk.fill(but_bytes=n_pages * PAGE)
        told = sentence_of(do)
        if not told:
            return n_pages
        assert told.startswith("No room is left for writing in ")
        assert "Nothing of this act was stored; make room and repeat it." in told
    raise AssertionError("never done")


def sentence_of(do: Callable[[], None]) -> str:
    try:
        do()
    except SetupError as told:
        return str(told)
    return ""


@pytest.mark.parametrize("name", DEEDS)
def test_an_act_that_finds_no_room_leaves_nothing_and_can_be_repeated(
    small_disk: SmallDisk, settings: Settings, name: str
) -> None:
    path = small_disk.path / "q17.trial"
    with acts.start(path, settings) as trial:
        acts.carry_out(trial, DEEDS, until=name)
        entries, before = trial.entries(), path.read_bytes()

        def act_once() -> None:
            assert trial.entries() == entries
            assert path.read_bytes() == before
            with trial.act() as act:
                DEEDS[name](trial, act)

        assert with_less_and_more_room(small_disk, act_once) > 0
        assert len(trial.entries()) == len(entries) + 1
        assert trial.check_chain() == ()


def test_a_new_trial_file_that_finds_no_room_does_not_appear(
    small_disk: SmallDisk, settings: Settings
) -> None:
    path = small_disk.path / "q17.trial"

    def start() -> None:
        assert [found.name for found in small_disk.path.iterdir()] == ["ballast"]
        acts.start(path, settings).close()

    assert with_less_and_more_room(small_disk, start) > 1


def test_a_backup_that_finds_no_room_is_taken_away_and_not_recorded(
    small_disk: SmallDisk, settings: Settings, tmp_path: Path
) -> None:
    with acts.start(tmp_path / "q17.trial", settings) as trial:
        acts.live(trial)
        to = small_disk.path / "copy.trial"

        def back_up() -> None:
            assert [found.name for found in small_disk.path.iterdir()] == ["ballast"]
            assert trial.entries()[-1].kind != "backup"
            trial.back_up(to, by="M. Berg")

        assert with_less_and_more_room(small_disk, back_up) > 1
        assert trial.entries()[-1].kind == "backup"
    with Trial.open(to, settings) as copied:
        assert copied.check_chain() == ()


def test_a_file_on_a_read_only_disk_is_read_and_verified_and_takes_no_act(
    small_disk: SmallDisk, settings: Settings
) -> None:
    path = small_disk.path / "q17.trial"
    with acts.start(path, settings) as trial:
        acts.live(trial)
        state = trial.state()
    small_disk.make_read_only()
    with Trial.open(path, settings) as trial:
        assert trial.read_only
        assert trial.check_chain() == ()
        assert trial.state() == state
        with pytest.raises(SetupError, match="No permission to write in"), trial.act():
            pass


def cut_off_in_the_middle(trial: Trial, to: Path) -> None:
    """Copy file and journal as a loss of power leaves them while an act reaches the file.

    SQLite writes the journal's magic number and its count of pages only when it begins to overwrite the file.
    """
    with trial.act() as act:
        acts.receive(act, 1)
        journal = bytearray(Path(f"{trial.path}-journal").read_bytes())
        content = bytearray(trial.path.read_bytes())
    n_pages = (len(journal) - 512) // (PAGE + 8)
    journal[:12] = bytes.fromhex("d9d505f920a163d7") + n_pages.to_bytes(4)
    begun = int.from_bytes(journal[512:516]) - 1  # a page that the journal holds as it was before
    content[begun * PAGE : (begun + 1) * PAGE] = b"half of a page".ljust(PAGE)
    to.write_bytes(content)
    Path(f"{to}-journal").write_bytes(journal)


def test_an_act_that_was_cut_off_waits_where_nothing_can_be_written(
    small_disk: SmallDisk, settings: Settings, tmp_path: Path
) -> None:
    there, own = small_disk.path / "q17.trial", tmp_path / "own.trial"
    with acts.start(tmp_path / "q17.trial", settings) as trial:
        cut_off_in_the_middle(trial, there)
    small_disk.make_read_only()
    with pytest.raises(SetupError) as told:
        Trial.open(there, settings)
    assert str(told.value) == (
        f"An act that was cut off waits to be undone in {there}. "
        "Found its journal, in a place that may not be written. "
        "Accepted: a file and a folder that may be written. "
        "Copy the file together with its journal to a folder of your own and open it there."
    )
    shutil.copy(there, own)
    shutil.copy(f"{there}-journal", f"{own}-journal")
    with Trial.open(own, settings) as trial:
        assert trial.check_chain() == ()
        assert len(trial.entries()) == 1
