"""One act, one transaction; what is read back is what was stored."""

from __future__ import annotations

import re
import threading
from collections.abc import Callable
from datetime import date
from pathlib import Path

import pytest

from app.errors import LedgerError, SetupError
from app.ledger.bodies import LookFrozen, ReportWritten
from app.ledger.trial import Act, Trial
from app.record.canonical import digest
from app.settings import Settings
from tests.ledger import acts


class Interrupted(Exception):
    """What comes between."""


def break_off(trial: Trial, do: Callable[[Trial, Act], None]) -> None:
    with trial.act() as act:
        do(trial, act)
        raise Interrupted


@pytest.mark.parametrize("name", acts.LIFE)
def test_an_act_that_breaks_off_leaves_nothing(trial: Trial, name: str) -> None:
    acts.live(trial, until=name)
    before, state = trial.path.read_bytes(), trial.state()
    with pytest.raises(Interrupted):
        break_off(trial, acts.LIFE[name])
    assert trial.path.read_bytes() == before
    assert trial.state() == state


def test_an_act_can_be_repeated_after_it_broke_off(trial: Trial) -> None:
    with pytest.raises(Interrupted):
        break_off(trial, acts.LIFE["receive the first"])
    acts.live(trial)
    assert trial.check_chain() == ()


def test_inside_an_act_the_trial_tells_what_the_act_added(trial: Trial) -> None:
    with trial.act() as act:
        acts.receive(act, 1)
        assert trial.state() == act.state
        assert trial.snapshot(1).files == acts.snapshot(1).files
        assert trial.letter_key().commitment == act.state.letters_commitment
    assert trial.state().open_look is not None


def test_an_act_of_several_entries_carries_one_time(trial: Trial) -> None:
    with trial.act() as act:
        acts.receive(act, 1)
        acts.freeze(act, 1)
        acts.receive(act, 2)
    assert len({entry.at for entry in trial.entries()[1:]}) == 1
    assert re.fullmatch(r"2026-01-15T09:\d\d:00Z", trial.state().last_at)


def test_the_state_tells_what_was_done(lived: Trial) -> None:
    state = lived.state()
    assert (state.name, state.locked_by, state.unmasked) == ("Q17", "M. Berg", True)
    assert [look.number for look in state.frozen_looks] == [1, 2]
    assert state.open_look is None
    assert state.opened(1, "first evening")
    assert not state.opened(2, "first evening")
    assert lived.content(lived.state().plan_digest) == acts.PLAN
    assert lived.content(state.frozen_look(2).body.record_digest) == b'{"look":2}'


def test_the_head_that_a_report_prints_is_the_one_before_its_freeze(lived: Trial) -> None:
    digests = [entry.digest for entry in lived.entries()]
    frozen = lived.state().frozen_look(1)
    assert frozen.body.head_before == digests[frozen.head.id - 2]
    assert frozen.head.digest == digests[frozen.head.id - 1]


def test_a_snapshot_comes_back_as_it_was_received(lived: Trial) -> None:
    sent, kept = acts.snapshot(2), lived.snapshot(2)
    assert kept.files == sent.files
    assert (kept.kind, kept.cutoff, kept.extracted) == ("planned", date(2026, 1, 2), date(2026, 1, 3))
    assert kept.acknowledgements == sent.acknowledgements
    assert kept.received_at == lived.state().look(2).received_at


def test_the_same_bytes_are_stored_once(trial: Trial) -> None:
    with trial.act() as act:
        assert act.store(acts.PLAN) == digest(acts.PLAN)
        acts.receive(act, 1)
    assert trial._database.value("SELECT count(*) FROM content") == 3


def test_bytes_that_no_entry_names_are_a_bug_in_the_caller(trial: Trial) -> None:
    with pytest.raises(ValueError, match="named by no entry"), trial.act() as act:
        act.store(b"loose")
    assert trial._database.value("SELECT count(*) FROM content") == 1


def test_naming_bytes_that_were_not_stored_is_a_bug_in_the_caller(trial: Trial) -> None:
    with trial.act() as act:
        acts.receive(act, 1)
    with pytest.raises(ValueError, match="look 1, frozen record is named by an entry and was not stored"):
        freeze_without_storing(trial)
    assert trial.state().open_look is not None


def freeze_without_storing(trial: Trial) -> None:
    with trial.act() as act:
        head = act.state.head.digest
        act.append(LookFrozen(1, "0" * 64, "1" * 64, "masked", head, {}, "M. Berg"))


def test_an_act_within_an_act_is_a_bug_in_the_caller(trial: Trial) -> None:
    with trial.act(), pytest.raises(ValueError, match="within"), trial.act():
        pass


def test_a_trial_opened_for_reading_takes_no_act(lived: Trial, settings: Settings) -> None:
    with Trial.open(lived.path, settings, read_only=True) as reader:
        assert reader.state() == lived.state()
        with pytest.raises(SetupError) as fault, reader.act():
            pass
    assert str(fault.value) == (
        f"No permission to write in {lived.path}. Found a trial file that is open for reading only. "
        "Accepted: a file and a folder that may be written. "
        "Nothing of this act was stored; give the permission, or copy the file to a folder of your own."
    )


def test_what_another_program_did_is_seen(trial: Trial, settings: Settings) -> None:
    assert trial.state().looks == ()
    with Trial.open(trial.path, settings) as other:
        acts.live(other, until="unmask")
    assert len(trial.state().frozen_looks) == 1
    with trial.act() as act:
        acts.receive(act, 2)
    assert trial.check_chain() == ()


def test_threads_take_turns(trial: Trial) -> None:
    with trial.act() as act:
        acts.receive(act, 1)

    def open_results(number: int) -> None:
        with trial.act() as act:
            acts.open_results(act, 1, session=f"session {number}")

    threads = [threading.Thread(target=open_results, args=(number,)) for number in range(8)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert len(trial.state().openings) == 8
    assert trial.check_chain() == ()


def test_a_report_written_must_be_the_frozen_one(trial: Trial) -> None:
    acts.live(trial, until="write its report")
    plan = trial.state().plan_digest
    with pytest.raises(LedgerError, match="not the frozen report of look 1"), trial.act() as act:
        act.append(ReportWritten(1, plan))


def test_the_file_is_private(trial: Trial) -> None:
    assert trial.path.stat().st_mode & 0o777 == 0o600


def test_the_journal_of_an_act_is_private(trial: Trial) -> None:
    with trial.act() as act:
        acts.receive(act, 1)
        journal = Path(f"{trial.path}-journal")
        assert journal.stat().st_mode & 0o777 == 0o600
    assert not journal.exists()
