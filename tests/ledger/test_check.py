"""What was altered is found and named; what no chain can find is found by a head kept elsewhere."""

from __future__ import annotations

import random
import sqlite3
from dataclasses import replace
from hashlib import sha256
from pathlib import Path
from time import process_time

import pytest

from app.errors import AppError, LedgerChanged
from app.ledger.check import quick_check
from app.ledger.entries import history_lines, read_body
from app.ledger.trial import Trial
from app.record.canonical import digest
from app.settings import Settings
from tests.ledger import acts
from tests.ledger.attacks import rechain, shell_without_triggers


def problems(path: Path, settings: Settings, witnessed_heads: tuple[str, ...] = ()) -> list[str]:
    """What a check finds; the damaged file stays byte for byte as it is, and takes no act."""
    before = path.read_bytes()
    with Trial.open(path, settings) as trial:
        found = [str(problem) for problem in trial.check_chain(witnessed_heads)]
        if found:
            with pytest.raises(LedgerChanged, match="A damaged trial file is not written to"), trial.act():
                pass
    assert path.read_bytes() == before
    return found


def test_a_file_as_it_was_written_has_no_problem(lived: Trial, settings: Settings) -> None:
    heads = tuple(entry.digest for entry in lived.entries())
    assert problems(lived.path, settings, heads) == []


def test_a_flipped_byte_in_a_stored_file_is_found_and_named(lived: Trial, settings: Settings) -> None:
    content = bytearray(lived.path.read_bytes())
    place = content.index(b"00399,798,1")  # the last row of the second extract
    content[place] ^= 1
    lived.path.write_bytes(content)
    assert problems(lived.path, settings) == ["snapshot 2, file adtte-2.csv: bytes changed"]


@pytest.mark.parametrize(
    ("text", "place"),
    [
        (acts.PLAN, "the locked plan"),
        (b'{"look":1}', "look 1, frozen record"),
        (b"<html>Look 2</html>", "look 2, closed report"),
        (b'{"letters":', "the sealed arm letters"),
    ],
)
def test_every_stored_content_is_named_by_its_place(
    lived: Trial, settings: Settings, text: bytes, place: str
) -> None:
    content = lived.path.read_bytes()
    assert content.count(text) == 1
    lived.path.write_bytes(content.replace(text, bytes([text[0] ^ 1]) + text[1:]))
    assert f"{place}: bytes changed" in problems(lived.path, settings)


@pytest.mark.parametrize(
    ("column", "value"), [("at", "2026-02-01T00:00:00Z"), ("kind", "verification"), ("body", "{}")]
)
def test_an_edited_entry_is_found(lived: Trial, settings: Settings, column: str, value: str) -> None:
    with shell_without_triggers(lived.path) as shell:
        shell.execute(f"UPDATE entry SET {column} = ? WHERE id = 3", (value,))
    assert problems(lived.path, settings) == ["entry 3: changed: its digest is of something else"]


def test_an_edited_entry_with_its_digest_made_again_is_found_by_the_next(
    lived: Trial, settings: Settings
) -> None:
    entry = lived.entries()[2]
    forged = replace(entry, at="2026-02-01T00:00:00Z")
    with shell_without_triggers(lived.path) as shell:
        shell.execute("UPDATE entry SET at = ?, digest = ? WHERE id = 3", (forged.at, digest(forged.line)))
    assert problems(lived.path, settings) == ["entry 4: does not follow entry 3 as that stands now"]


def test_an_entry_taken_out_is_found(lived: Trial, settings: Settings) -> None:
    with shell_without_triggers(lived.path) as shell:
        shell.execute("DELETE FROM entry WHERE id = 5")
    assert problems(lived.path, settings)[0] == "entry 6: follows entry 4, entries between them are missing"


def test_triggers_left_out_or_weakened_are_found(lived: Trial, settings: Settings) -> None:
    with sqlite3.connect(lived.path) as shell:
        shell.execute("DROP TRIGGER entry_update")
        shell.execute("DROP TRIGGER content_delete")
        shell.execute("CREATE TRIGGER content_delete BEFORE DELETE ON content BEGIN SELECT 1; END")
        shell.execute("CREATE VIEW more AS SELECT 1")
    shell.close()
    assert problems(lived.path, settings) == [
        "the rule or table 'content_delete' of the file: changed",
        "the rule or table 'entry_update' of the file: missing",
        "the rule or table 'more' of the file: not made by this program",
    ]


def test_stored_bytes_taken_out_are_missed_wherever_they_belong(lived: Trial, settings: Settings) -> None:
    with shell_without_triggers(lived.path) as shell:
        shell.execute("DELETE FROM content WHERE digest = ?", (digest(b"<html>Look 1</html>"),))
    assert problems(lived.path, settings) == [
        "look 1, closed report: bytes missing",
        "look 1, written report: bytes missing",
    ]


def test_stored_bytes_slipped_in_are_found(lived: Trial, settings: Settings) -> None:
    with sqlite3.connect(lived.path) as shell:
        shell.execute("INSERT INTO content VALUES (?, ?)", (digest(b"more"), b"more"))
    shell.close()
    assert problems(lived.path, settings) == [f"stored bytes {digest(b'more')}: no entry names them"]


def test_exchanged_letters_are_found(trial: Trial, settings: Settings) -> None:
    swapped = {b'"A"': b'"B"', b'"B"': b'"A"'}
    sealed = trial.letter_key().sealed
    parts = [swapped.get(part, part) for part in (sealed[:22], sealed[22:25], sealed[25:41], sealed[41:44])]
    other = b"".join(parts) + sealed[44:]
    assert sorted(other) == sorted(sealed)
    with shell_without_triggers(trial.path) as shell:
        shell.execute("UPDATE secret SET bytes = ?", (other,))
    assert problems(trial.path, settings) == ["the sealed arm letters: bytes changed"]
    with Trial.open(trial.path, settings) as opened, pytest.raises(LedgerChanged, match="Bytes changed"):
        opened.letter_key()


def test_an_order_that_cannot_be_is_found_though_every_digest_is_right(
    lived: Trial, settings: Settings
) -> None:
    with shell_without_triggers(lived.path) as shell:
        shell.execute("DELETE FROM entry WHERE id = 4")  # the freeze of the first look
        rechain(shell)
    found = problems(lived.path, settings)
    assert found[0] == "entry 4: Look 1 is not frozen. Freeze it first."


def test_a_cut_tail_is_found_by_a_witnessed_head_only(lived: Trial, settings: Settings) -> None:
    last = lived.head()
    with shell_without_triggers(lived.path) as shell:
        shell.execute("DELETE FROM entry WHERE id = 9")
        shell.execute("DELETE FROM content WHERE bytes IN (?, ?)", (b'{"look":2}', b"<html>Look 2</html>"))
    assert problems(lived.path, settings) == []
    assert problems(lived.path, settings, (last,)) == [
        f"the head {last}: no entry has it: the end was cut off, or the history rewritten"
    ]


def test_a_rewritten_history_is_found_by_a_witnessed_head_only(lived: Trial, settings: Settings) -> None:
    witnessed = lived.state().frozen_look(2).body.head_before
    with shell_without_triggers(lived.path) as shell:
        shell.execute("UPDATE entry SET at = '2026-01-15T08:00:00Z' WHERE id = 1")
        rechain(shell, forge_heads=True)
    assert problems(lived.path, settings) == []
    assert problems(lived.path, settings, (witnessed,)) == [
        f"the head {witnessed}: no entry has it: the end was cut off, or the history rewritten"
    ]


def test_an_older_copy_put_back_is_found_by_a_witnessed_head_only(trial: Trial, settings: Settings) -> None:
    older = trial.path.read_bytes()
    acts.live(trial)
    head = trial.head()
    trial.close()
    trial.path.write_bytes(older)
    assert problems(trial.path, settings) == []
    assert len(problems(trial.path, settings, (head,))) == 1


def test_a_history_exchanged_under_an_open_trial_is_noticed_at_the_next_act(
    trial: Trial, tmp_path: Path
) -> None:
    trial.state()
    with acts.start(tmp_path / "another.trial", acts.ticking_settings(seed=18)) as other:
        acts.live(other, until="open results")
    trial.path.write_bytes(other.path.read_bytes())
    with pytest.raises(
        LedgerChanged, match=r"A history that is not as it was written .* entry 1 gone or another"
    ):
        trial.state()


def test_a_copy_put_back_in_place_is_noticed_though_it_was_changed_as_often(
    trial: Trial, settings: Settings, tmp_path: Path
) -> None:
    other = tmp_path / "other.trial"
    other.write_bytes(trial.path.read_bytes())
    with trial.act() as act:
        acts.receive(act, 1)
    with Trial.open(other, settings) as forked, forked.act() as act:
        acts.correct(act)
    there, here = other.read_bytes(), trial.path.read_bytes()
    assert there[24:28] == here[24:28]  # SQLite's own count of changes cannot tell them apart
    with trial.path.open("r+b") as file:
        file.write(there)
    with pytest.raises(LedgerChanged, match=r"A history that is not as it was written .* entry 2 gone"):
        trial.state()
    with pytest.raises(LedgerChanged, match="entry 2 gone"), trial.act():
        pass
    assert trial.path.read_bytes()[: len(there)] == there


def test_before_a_freeze_the_chain_is_walked_again(lived: Trial) -> None:
    lived.check_quickly()
    with lived.act():
        lived.check_quickly()  # within an act too
    with shell_without_triggers(lived.path) as shell:
        shell.execute("UPDATE entry SET at = '2026-02-01T00:00:00Z' WHERE id = 3")
    with pytest.raises(LedgerChanged) as told:
        lived.check_quickly()
    assert str(told.value) == (
        f"A damaged trial file is not written to in {lived.path}. "
        "Found entry 3: changed: its digest is of something else. "
        "Nothing of this act was stored; keep this file as it is and go on from a verified backup."
    )
    with pytest.raises(LedgerChanged, match="A damaged trial file"), lived.act():
        pass


def test_columns_of_another_type_are_found(lived: Trial, settings: Settings) -> None:
    with shell_without_triggers(lived.path) as shell:
        shell.execute("UPDATE entry SET body = x'ff' WHERE id = 2")
        shell.execute("UPDATE entry SET at = CAST(x'ff' AS TEXT) WHERE id = 5")
    assert problems(lived.path, settings)[:2] == [
        "entry 2: damaged: its columns do not read",
        "entry 5: damaged: its columns do not read",
    ]


def test_an_emptied_history_is_found(lived: Trial, settings: Settings) -> None:
    with shell_without_triggers(lived.path) as shell:
        shell.execute("DELETE FROM entry")
    assert problems(lived.path, settings)[0] == "the history: no entry left"


def test_a_damaged_file_opens_for_reading_only(lived: Trial, settings: Settings) -> None:
    with shell_without_triggers(lived.path) as shell:
        shell.execute("UPDATE entry SET at = '' WHERE id = 9")
    with Trial.open(lived.path, settings) as trial:
        assert trial.read_only
        assert [str(problem) for problem in trial.damage] == [
            "entry 9: changed: its digest is of something else"
        ]
        assert trial.content(digest(acts.PLAN)) == acts.PLAN
        with pytest.raises(LedgerChanged, match="entry 9: changed"):
            trial.state()


@pytest.mark.slow
@pytest.mark.parametrize("seed", range(8))
def test_bytes_changed_anywhere_are_found_or_change_nothing(
    a_life: bytes, path: Path, settings: Settings, seed: int
) -> None:
    chance = random.Random(seed)
    path.write_bytes(a_life)
    whole = all_that_a_trial_says(path, settings)
    for spoil in (flip_a_bit, set_a_byte_of_the_first_page, overwrite_sixteen, set_a_byte_of_a_page_header):
        for _ in range(12):
            spoilt = bytearray(a_life)
            spoil(spoilt, chance)
            path.write_bytes(spoilt)
            assert all_that_a_trial_says(path, settings) in (whole, "found")


def flip_a_bit(content: bytearray, chance: random.Random) -> None:
    content[chance.randrange(len(content))] ^= 1 << chance.randrange(8)


def set_a_byte_of_the_first_page(content: bytearray, chance: random.Random) -> None:
    content[chance.randrange(110)] = chance.randrange(256)


def overwrite_sixteen(content: bytearray, chance: random.Random) -> None:
    """Reaches names of the schema, which SQLite then quotes in its own messages."""
    place = chance.randrange(len(content) - 16)
    content[place : place + 16] = chance.randbytes(16)


def set_a_byte_of_a_page_header(content: bytearray, chance: random.Random) -> None:
    content[chance.randrange(len(content) // 4096) * 4096 + chance.randrange(12)] = chance.randrange(256)


def all_that_a_trial_says(path: Path, settings: Settings) -> object:
    """Everything that can be read, or the word "found" when the damage is told; never another exception."""
    before = path.read_bytes()
    try:
        with Trial.open(path, settings) as trial:
            if trial.check_chain():
                assert path.read_bytes() == before
                return "found"
            entries = trial.entries()
            named = [name for entry in entries for name in read_body(entry).contents()]
            return entries, [trial.content(key) for _, key in named], trial.letter_key()
    except AppError:
        assert path.read_bytes() == before
        return "found"


def test_the_exported_history_is_checked_with_a_digest_alone(lived: Trial) -> None:
    lines = history_lines(lived.entries()).splitlines()
    previous = "0" * 64
    for line in lines:
        assert line.endswith(b'"previous":"%b"}' % previous.encode())
        previous = sha256(line).hexdigest()
    assert previous == lived.head()


def test_a_thousand_entries_are_walked_in_well_under_a_second(trial: Trial) -> None:
    with trial.act() as act:
        for _ in range(1000):
            acts.record_verification(act)
    began = process_time()
    assert trial.check_chain() == ()
    assert process_time() - began < 1.0


def test_the_quick_check_does_not_read_the_stored_bytes(lived: Trial) -> None:
    statements: list[str] = []
    lived._database._connection.set_trace_callback(statements.append)
    assert quick_check(lived._database) == ()
    assert statements != []
    assert not any("bytes" in statement for statement in statements)
