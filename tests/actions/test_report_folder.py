"""The folder of a closed report is checked by anyone, with plain Python and nothing of this program."""

from __future__ import annotations

import json
import shutil
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import pytest

from app.actions.check import verify
from app.actions.desk import Desk
from app.actions.report import VERIFIER, write_report
from app.errors import InputError, SetupError
from app.settings import Settings
from tests.conftest import SmallDisk

STEM = "Q17-look-2-closed-masked"


@pytest.fixture
def folder(desk: Desk, tmp_path: Path) -> Path:
    """A folder with the report of the second look, far from any trial file."""
    write_report(desk, 2, tmp_path / "elsewhere")
    return tmp_path / "elsewhere"


def verifier(folder: Path, *words: str) -> tuple[int, str]:
    """Run the verifier of the folder in a Python without site packages, from another folder."""
    command = [sys.executable, "-I", "-S", str(folder / VERIFIER), *words]
    done = subprocess.run(command, capture_output=True, text=True, cwd="/", check=False)
    assert done.stderr == ""
    return done.returncode, done.stdout


def test_the_folder_holds_all_that_a_third_party_needs(folder: Path) -> None:
    names = [f"{STEM}.{kind}" for kind in ("html", "record.json", "history.jsonl", "environment.json")]
    assert sorted(path.name for path in folder.iterdir()) == sorted([*names, VERIFIER])
    assert {path.stat().st_mode & 0o777 for path in folder.iterdir()} == {0o600}


def test_a_sound_folder_passes_and_tells_both_heads(folder: Path, desk: Desk) -> None:
    code, said = verifier(folder)
    frozen = desk.trial.state().frozen_look(2)
    assert code == 0
    assert "FAILED" not in said
    assert f"The report prints the head before its freeze, {frozen.body.head_before}." in said
    assert f"The head after its freeze is {frozen.head.digest}." in said


def test_the_history_ends_with_the_freeze_and_holds_no_letters(folder: Path, desk: Desk) -> None:
    history = (folder / f"{STEM}.history.jsonl").read_text()
    assert [json.loads(line)["kind"] for line in history.splitlines()][-1] == "look frozen"
    assert desk.trial.letter_key().salt not in history


def test_a_witnessed_head_is_looked_for(folder: Path, desk: Desk) -> None:
    first = desk.trial.entries()[0].digest
    code, said = verifier(folder, first.upper())
    assert (code, f"The head kept elsewhere, {first}, is that of entry 1." in said) == (0, True)
    code, said = verifier(folder, "f" * 64)
    assert code == 1
    assert "is that of no entry: cut off, or written anew." in said


def edited(suffix: str, before: bytes, after: bytes) -> Callable[[Path], None]:
    def edit(folder: Path) -> None:
        path = folder / f"{STEM}.{suffix}"
        content = path.read_bytes()
        assert before in content
        path.write_bytes(content.replace(before, after, 1))

    return edit


def without_line(number: int) -> Callable[[Path], None]:
    def cut(folder: Path) -> None:
        path = folder / f"{STEM}.history.jsonl"
        lines = path.read_bytes().splitlines(keepends=True)
        path.write_bytes(b"".join(lines[:number] + lines[number + 1 :]))

    return cut


def report_of_the_other_look(folder: Path) -> None:
    shutil.copy(folder / "other" / "Q17-look-1-closed-masked.html", folder / f"{STEM}.html")
    shutil.copy(folder / "other" / "Q17-look-1-closed-masked.record.json", folder / f"{STEM}.record.json")


SPOILT: dict[str, Callable[[Path], None]] = {
    "Its last entry is the freeze of this report, by the report's SHA-256.": edited(
        "html", b"Advisory.", b"Binding.."
    ),
    "The record in the report is the one whose SHA-256 the report prints.": edited(
        "html", b"kind&#34;: &#34;look", b"kind&#34;: &#34;book"
    ),
    "The record beside the report is the same.": edited("record.json", b'"look"', b'"book"'),
    "The history is no chain that ends in a freeze: line 2 does not follow the line before it as that stands "
    "now.": edited("history.jsonl", b"A. Statistician", b"A. Nother"),
    "The history is no chain that ends in a freeze: line 2 is entry 3, lines are missing.": without_line(1),
    "The history is no chain that ends in a freeze: its last line is no freeze.": without_line(4),
}


@pytest.mark.parametrize("sentence", SPOILT)
def test_what_was_changed_is_found(folder: Path, settings: Settings, sentence: str) -> None:
    SPOILT[sentence](folder)
    code, said = verifier(folder)
    assert code == 1
    assert f"FAILED  {STEM}.html: {sentence}" in said.splitlines()
    ours = [line.text for line in verify(settings, folder).lines if not line.ok]
    assert f"{STEM}.html: {sentence}" in ours  # the program itself says the same


def test_the_report_of_another_look_is_no_substitute(folder: Path, desk: Desk) -> None:
    write_report(desk, 1, folder / "other")
    report_of_the_other_look(folder)
    code, said = verifier(folder)
    assert code == 1
    for sentence in (
        "Its last entry is the freeze of this report, by the report's SHA-256.",
        "It rests on the files that the history names.",
    ):
        assert f"FAILED  {STEM}.html: {sentence}" in said.splitlines()


def test_a_report_alone_says_what_was_not_checked(folder: Path, settings: Settings) -> None:
    (folder / f"{STEM}.history.jsonl").unlink()
    code, said = verifier(folder)
    assert code == 0
    assert "No history lies beside it, so that its own record alone was checked." in said
    assert verifier(folder, "0" * 64)[0] == 1  # a head cannot be looked for
    assert verify(settings, folder).ok


def test_reports_of_several_looks_lie_in_one_folder(folder: Path, desk: Desk) -> None:
    write_report(desk, 1, folder)
    code, said = verifier(folder)
    assert code == 0
    assert said.count("Its last entry is the freeze of this report") == 2


def test_a_folder_without_reports_is_told(tmp_path: Path, folder: Path, settings: Settings) -> None:
    code, said = verifier(folder, str(tmp_path / "nothing"))
    assert (code, said) == (1, f"FAILED  {tmp_path / 'nothing'}: no report (.html) is here.\n")
    (tmp_path / "empty").mkdir()
    with pytest.raises(InputError, match="No report to verify"):
        verify(settings, tmp_path / "empty")


def test_a_full_disk_leaves_no_half_written_file_and_no_entry(desk: Desk, small_disk: SmallDisk) -> None:
    small_disk.fill(but_bytes=64 * 1024)
    before = desk.trial.entries()
    with pytest.raises(SetupError) as told:
        write_report(desk, 2, small_disk.path)
    assert str(told.value).startswith(f"A report file cannot be written in {small_disk.path}")
    assert "Found No space left on device." in str(told.value)
    whole = {path.name for path in small_disk.path.iterdir()} - {"ballast"}
    assert all(not name.endswith(".unfinished") for name in whole)
    assert desk.trial.entries() == before
    small_disk.empty()
    write_report(desk, 2, small_disk.path)
    assert desk.trial.entries()[-1].kind == "report written"
