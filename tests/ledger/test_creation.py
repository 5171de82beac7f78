"""A new trial file appears whole, private, and never in the place of another."""

from __future__ import annotations

import errno
import os
from collections.abc import Callable
from datetime import datetime
from pathlib import Path

import pytest

from app.errors import AppError, SetupError, ValueRejected
from app.ledger.trial import Trial
from app.settings import Settings
from tests.ledger import acts


def failing(number: int) -> Callable[..., None]:
    """Stands in for a call of the operating system that fails with this number."""

    def fail(*_: object, **__: object) -> None:
        raise OSError(number, os.strerror(number))

    return fail


def test_a_new_file_stands_alone_in_its_folder(trial: Trial) -> None:
    assert list(trial.path.parent.iterdir()) == [trial.path]
    assert trial.path.stat().st_nlink == 1


def test_the_file_is_private_whatever_the_umask(path: Path, settings: Settings) -> None:
    before = os.umask(0)
    try:
        acts.start(path, settings).close()
    finally:
        os.umask(before)
    assert path.stat().st_mode & 0o777 == 0o600


def test_no_file_is_overwritten(path: Path, settings: Settings) -> None:
    path.write_text("a letter")
    with pytest.raises(ValueRejected) as refused:
        acts.start(path, settings)
    assert str(refused.value) == (
        f"No new trial file can be made in {path}. Found a file of that name already. Accepted: a new name. "
        "Choose another name; nothing was overwritten."
    )
    assert path.read_text() == "a letter"


def test_no_file_is_overwritten_that_came_in_the_meantime(path: Path, settings: Settings) -> None:
    def clock_while_another_comes_first() -> datetime:
        path.write_text("a letter")
        return settings.clock()

    with pytest.raises(ValueRejected, match="a file of that name already"):
        acts.start(path, Settings(clock=clock_while_another_comes_first))
    assert [path.read_text() for path in path.parent.iterdir()] == ["a letter"]


def test_a_dangling_link_counts_as_a_file(path: Path, settings: Settings) -> None:
    path.symlink_to(path.with_name("nowhere"))
    with pytest.raises(ValueRejected, match="a file of that name already"):
        acts.start(path, settings)


def test_a_folder_that_is_not_there_is_told(tmp_path: Path, settings: Settings) -> None:
    path = tmp_path / "nowhere" / "q17.trial"
    with pytest.raises(ValueRejected) as refused:
        acts.start(path, settings)
    assert str(refused.value) == (
        f"No new trial file can be made in {path}. Found no such folder. "
        "Accepted: a path in a folder that exists. Make the folder first, or choose another."
    )


@pytest.mark.parametrize(
    ("number", "sentence"),
    [
        (errno.ENOSPC, "No room is left for writing in"),
        (errno.EACCES, "No permission to write in"),
        (errno.EROFS, "No permission to write in"),
        (errno.EIO, "The disk failed to read or write in"),
    ],
)
@pytest.mark.parametrize("call", ["tempfile.mkstemp", "os.fsync"])
def test_a_fault_of_the_disk_is_told(
    path: Path, settings: Settings, monkeypatch: pytest.MonkeyPatch, number: int, sentence: str, call: str
) -> None:
    monkeypatch.setattr(call, failing(number))
    with pytest.raises(SetupError) as told:
        acts.start(path, settings)
    assert str(told.value).startswith(f"{sentence} {path}. ")


def test_a_file_system_without_hard_links_is_no_obstacle(
    path: Path, settings: Settings, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("os.link", failing(errno.EPERM))
    with acts.start(path, settings) as trial:
        assert trial.check_chain() == ()
    assert list(path.parent.iterdir()) == [path]


def test_without_hard_links_too_no_file_is_overwritten(
    path: Path, settings: Settings, monkeypatch: pytest.MonkeyPatch
) -> None:
    def fail(*names: object) -> None:
        path.write_text("a letter")
        failing(errno.EPERM)()

    monkeypatch.setattr("os.link", fail)
    with pytest.raises(AppError):
        acts.start(path, settings)
    assert path.read_text() == "a letter"


def test_what_breaks_off_leaves_no_file(
    path: Path, settings: Settings, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("app.ledger.trial.draw_letters", failing(errno.EIO))
    with pytest.raises(OSError, match="Input/output error"):
        acts.start(path, settings)
    assert list(path.parent.iterdir()) == []
