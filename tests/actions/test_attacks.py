"""Each attack on a trial file: what is refused, what is found, and what only a head kept elsewhere finds.

DEVELOPERS.md, "Attacks", is the table of these tests, a row for each.
"""

from __future__ import annotations

import json
import sqlite3
from dataclasses import replace
from pathlib import Path

import pytest

from app.actions.check import verify
from app.actions.demo import make_demo
from app.actions.desk import Desk
from app.actions.freeze import freeze
from app.actions.report import write_report
from app.errors import LedgerError
from app.model.survival import LogrankResult
from app.record.text import record_bytes
from app.review import comparison
from app.settings import Settings
from app.survival import logrank_of
from app.survival.risk_table import RiskTable
from tests.actions import given
from tests.ledger.attacks import exchange_content, rechain, shell_without_triggers

NO_ENTRY = "no entry has it: the end was cut off, or the history rewritten"


def failed(path: Path, settings: Settings, *heads: str) -> list[str]:
    """What a full verification finds; it leaves the file byte for byte as it was."""
    before = path.read_bytes()
    report = verify(settings, path, heads=heads)
    assert path.read_bytes() == before
    return [line.text for line in report.lines if not line.ok]


def head_in_the_minutes(path: Path, settings: Settings) -> str:
    """The head that the closed report of the last frozen look prints."""
    with Desk.open(settings, path) as desk:
        frozen = desk.trial.state().frozen_looks[-1].frozen
        assert frozen is not None
        return frozen.body.head_before


def refused(path: Path, statement: str) -> str:
    before = path.read_bytes()
    shell = sqlite3.connect(path)
    with pytest.raises(sqlite3.IntegrityError) as told:
        shell.execute(statement)
    shell.close()
    assert path.read_bytes() == before
    return str(told.value)


def test_a_file_that_nobody_attacked_passes_with_its_witnessed_head(path: Path, settings: Settings) -> None:
    assert failed(path, settings, head_in_the_minutes(path, settings)) == []


def test_an_update_is_refused(path: Path) -> None:
    assert refused(path, "UPDATE entry SET at = '2026-01-01T00:00:00Z'") == "entry is never changed"
    assert refused(path, "UPDATE content SET bytes = x'00'") == "content is never changed"


def test_a_delete_is_refused(path: Path) -> None:
    assert refused(path, "DELETE FROM entry WHERE id = 2") == "entry is never deleted from"
    assert refused(path, "DELETE FROM secret") == "secret is never deleted from"


def test_an_insert_or_replace_is_refused(path: Path) -> None:
    entry = "INSERT OR REPLACE INTO entry SELECT id, '', kind, body, previous, digest FROM entry WHERE id = 2"
    content = "INSERT OR REPLACE INTO content SELECT digest, x'00' FROM content LIMIT 1"
    assert refused(path, entry) == "entry follows the last one"
    assert refused(path, content) == "content is never replaced"


def test_dropped_triggers_and_an_edited_entry_are_found_when_the_file_is_opened(
    path: Path, settings: Settings
) -> None:
    shell = sqlite3.connect(path)
    shell.execute("DROP TRIGGER entry_update")
    shell.execute("UPDATE entry SET at = '2026-01-01T00:00:00Z' WHERE id = 3")
    shell.commit()
    shell.close()
    with Desk.open(settings, path) as desk:
        assert [str(problem) for problem in desk.trial.damage] == [
            "the rule or table 'entry_update' of the file: missing",
            "entry 3: changed: its digest is of something else",
        ]
        with pytest.raises(LedgerError, match="A damaged trial file is not written to"):
            freeze(desk, by=given.BY)


def test_an_entry_edited_behind_triggers_that_were_put_back_is_found(path: Path, settings: Settings) -> None:
    with shell_without_triggers(path) as shell:
        shell.execute("UPDATE entry SET at = '2026-01-01T00:00:00Z' WHERE id = 3")
    assert failed(path, settings)[0] == "entry 3: changed: its digest is of something else"


def test_a_flipped_byte_in_a_stored_extract_is_found_and_the_extract_named(
    path: Path, settings: Settings
) -> None:
    content = bytearray(path.read_bytes())
    with Desk.open(settings, path) as desk:
        rows = desk.trial.snapshot(1).files[0].content.splitlines()
    row = next(row for row in rows if content.count(row) == 1)  # of no other extract, and whole on its page
    content[content.index(row)] ^= 1
    path.write_bytes(content)
    assert failed(path, settings)[0] == "snapshot 1, file extract-1.csv: bytes changed"


def test_a_cut_tail_is_found_by_the_witnessed_head_alone(path: Path, settings: Settings) -> None:
    witnessed = head_in_the_minutes(path, settings)
    with Desk.open(settings, path) as desk:
        entries, look = desk.trial.entries(), desk.trial.state().look(2)
        assert look.frozen is not None
        cut = [file.digest for file in desk.trial.state().look(3).snapshot.files]
        cut += [look.frozen.body.record_digest, look.frozen.body.report_digest]
        cut += [file.digest for file in look.snapshot.files]
        first = next(entry.id for entry in entries if entry.digest == witnessed)
    with shell_without_triggers(path) as shell:
        shell.execute("DELETE FROM entry WHERE id >= ?", (first,))
        shell.executemany("DELETE FROM content WHERE digest = ?", [(key,) for key in cut])
    assert failed(path, settings) == []
    assert failed(path, settings, witnessed) == [f"the head {witnessed}: {NO_ENTRY}"]


def test_a_history_written_anew_is_found_by_the_witnessed_head_alone(path: Path, settings: Settings) -> None:
    witnessed = head_in_the_minutes(path, settings)
    with Desk.open(settings, path) as desk:
        by = desk.trial.state().locked_by
    with shell_without_triggers(path) as shell:
        shell.execute("UPDATE entry SET body = replace(body, ?, 'A. Nother') WHERE id = 1", (by,))
        rechain(shell, forge_heads=True)
    assert failed(path, settings, witnessed)[0] == f"the head {witnessed}: {NO_ENTRY}"
    # so do the closed reports as long as they are not written anew as well, since they print the old heads
    assert [text for text in failed(path, settings) if "closed report" not in text] == []


def test_another_trial_in_the_place_of_the_file_is_refused_while_it_is_open(
    desk: Desk, tmp_path: Path, settings: Settings
) -> None:
    other = tmp_path / "other.trial"
    make_demo(replace(settings, random_bytes=lambda n: b"\x01" * n), other)
    witnessed = head_in_the_minutes(desk.path, settings)
    other.replace(desk.path)
    with pytest.raises(LedgerError, match="moved, removed or replaced since it was opened"):
        freeze(desk, by=given.BY)
    assert failed(desk.path, settings) == []  # it is a sound file, of another trial
    assert failed(desk.path, settings, witnessed) == [f"the head {witnessed}: {NO_ENTRY}"]


def test_an_older_copy_put_back_is_found_by_the_witnessed_head_alone(path: Path, settings: Settings) -> None:
    older = path.read_bytes()
    with Desk.open(settings, path) as desk:
        witnessed = freeze(desk, by=given.BY).head
    assert failed(path, settings, witnessed) == []
    path.write_bytes(older)
    assert failed(path, settings) == []
    assert failed(path, settings, witnessed) == [f"the head {witnessed}: {NO_ENTRY}"]


def test_an_older_copy_written_over_the_open_file_is_refused_at_the_next_act(desk: Desk, path: Path) -> None:
    older = path.read_bytes()
    freeze(desk, by=given.BY)
    with path.open("r+b") as file:
        file.write(older)
        file.truncate()
    with pytest.raises(LedgerError):
        given.receive_the_fourth(desk)
    assert path.read_bytes() == older


def test_a_number_changed_in_a_frozen_look_with_every_digest_made_again_is_found_and_named(
    path: Path, settings: Settings
) -> None:
    with Desk.open(settings, path) as desk:
        frozen = desk.trial.state().frozen_look(2).body
        record = json.loads(desk.trial.content(frozen.record_digest))
    z = record["looks"][0]["logrank"]["z"]
    record["looks"][0]["logrank"]["z"] = z + 0.5
    with shell_without_triggers(path) as shell:
        exchange_content(shell, frozen.record_digest, record_bytes(record))
        rechain(shell, forge_heads=True)
    found = failed(path, settings)
    assert f"look 2, frozen record, looks[0].logrank.z: stored {z + 0.5!r}, computed {z!r}" in found
    assert not any("chain" in text or "bytes changed" in text for text in found)


def patched_logrank(table: RiskTable, *, direction: int) -> LogrankResult:
    """The log-rank statistic, off by one millionth."""
    result = logrank_of(table, direction=direction)
    return replace(result, z=result.z * (1 + 1e-6))


def test_a_log_rank_patched_by_a_millionth_is_found_by_every_frozen_look(
    path: Path, settings: Settings, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(comparison, "logrank_of", patched_logrank)
    found = failed(path, settings)
    for number in (1, 2):
        assert any(text.startswith(f"look {number}, frozen record, looks[0].logrank.z: ") for text in found)


def test_a_look_frozen_by_a_patched_program_is_found_by_an_honest_one(
    path: Path, settings: Settings, monkeypatch: pytest.MonkeyPatch
) -> None:
    with monkeypatch.context() as patched, Desk.open(settings, path) as desk:
        patched.setattr(comparison, "logrank_of", patched_logrank)
        freeze(desk, by=given.BY)
    found = failed(path, settings)
    assert any(text.startswith("look 3, frozen record, looks[0].logrank.z: ") for text in found)
    assert not any(text.startswith(("look 1,", "look 2,")) for text in found)


def test_a_report_with_one_word_changed_is_found_without_this_program(
    path: Path, settings: Settings, tmp_path: Path
) -> None:
    with Desk.open(settings, path) as desk:
        write_report(desk, 2, tmp_path / "report")
    (report,) = (tmp_path / "report").glob("*.html")
    report.write_bytes(report.read_bytes().replace(b"Advisory.", b"Binding.", 1))
    found = failed_in_folder(tmp_path / "report", settings)
    assert found == [f"{report.name}: Its last entry is the freeze of this report, by the report's SHA-256."]


def failed_in_folder(folder: Path, settings: Settings) -> list[str]:
    return [line.text for line in verify(settings, folder).lines if not line.ok]
