"""What may follow what: an impossible sequence is refused with a sentence and leaves the file as it was."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import replace
from datetime import UTC, datetime
from pathlib import Path

import pytest

from app.errors import LedgerChanged, LedgerError, LookAlreadyFrozen
from app.ledger.bodies import (
    BODIES,
    ArmsUnmasked,
    Backup,
    Erratum,
    FindingKept,
    KeyChanged,
    LookFrozen,
    PlanAmended,
    PlanLocked,
    Recommendation,
    RefusalRecorded,
    ResultsOpened,
    SnapshotReceived,
    Verification,
)
from app.ledger.entries import Entry, Head, read_body
from app.ledger.history import State, advance, fold, follow
from app.ledger.letters import LetterKey, Letters
from app.ledger.trial import Act, Trial
from app.record.canonical import digest
from app.settings import Settings
from tests.ledger import acts

Do = Callable[[Act], object]


def refusal(trial: Trial, do: Do) -> str:
    before = trial.path.read_bytes()
    with pytest.raises(LedgerError) as refused, trial.act() as act:
        do(act)
    assert trial.path.read_bytes() == before
    return str(refused.value)


def freeze_as(act: Act, **changes: object) -> None:
    body = LookFrozen(1, act.store(b"r"), act.store(b"h"), "masked", act.state.head.digest, {}, "M. Berg")
    act.append(replace(body, **changes))


NO_LOOK = (
    "There is no look {} in this trial file. Found 0 looks. Name one of them, or receive its snapshot first."
)

BEFORE_ANY_SNAPSHOT: dict[str, Do] = {
    "A history begins with its plan being locked, once. Found 'plan locked' here.": lambda act: act.append(
        PlanLocked("Q17", "t", act.state.plan_digest, act.state.letters_commitment, "M. Berg")
    ),
    "A snapshot out of its turn. Found snapshot 2. Accepted: snapshot 1.": lambda act: acts.receive(act, 2),
    NO_LOOK.format(1): lambda act: acts.freeze(act, 1),
    NO_LOOK.format(3): lambda act: act.append(ResultsOpened(3, "s", "masked")),
    "These arm letters are not the ones committed to when the plan was locked.": lambda act: act.append(
        ArmsUnmasked("why", Letters("A", "B"), "00", "M. Berg")
    ),
    "The history grew while it was verified. Found entry 1. Accepted: entry 7 as the last. Verify again.": (
        lambda act: act.append(Verification("0" * 64, 7, 0, ()))
    ),
}

WITH_AN_OPEN_LOOK: dict[str, Do] = {
    "Look 1 is still open. Found a further snapshot. Accepted: one open look at a time. "
    "Freeze look 1 first.": lambda act: acts.receive(act, 2),
    "Look 1 is not frozen. Freeze it first.": lambda act: acts.write_report(act, 1),
    "Results of look 1 cannot be opened unmasked. Found masked arms.": lambda act: act.append(
        ResultsOpened(1, "another evening", "unmasked")
    ),
    "Results of look 1 are on record as opened in this session already.": lambda act: acts.open_results(
        act, 1
    ),
    "Look 1 cannot be frozen unmasked. Found masked arms.": lambda act: freeze_as(act, disclosure="unmasked"),
}


@pytest.mark.parametrize("sentence", BEFORE_ANY_SNAPSHOT)
def test_before_any_snapshot(trial: Trial, sentence: str) -> None:
    assert refusal(trial, BEFORE_ANY_SNAPSHOT[sentence]) == sentence


@pytest.mark.parametrize("sentence", WITH_AN_OPEN_LOOK)
def test_with_an_open_look(trial: Trial, sentence: str) -> None:
    acts.live(trial, until="freeze the first")
    assert refusal(trial, WITH_AN_OPEN_LOOK[sentence]) == sentence


def test_a_report_that_prints_another_head_is_not_frozen(trial: Trial) -> None:
    acts.live(trial, until="freeze the first")
    sentence = refusal(trial, lambda act: freeze_as(act, head_before="f" * 64))
    assert sentence == (
        f"The report of look 1 prints a head that is no longer the last. Found {'f' * 64}. "
        f"Accepted: {trial.head()}. Freeze again."
    )


@pytest.mark.parametrize("number", [1, 2])
def test_a_frozen_look_is_not_frozen_again(lived: Trial, number: int) -> None:
    with pytest.raises(LookAlreadyFrozen) as refused, lived.act() as act:
        acts.freeze(act, number)
    frozen = lived.state().frozen_look(number)
    assert str(refused.value) == (
        f"Look {number} is frozen already. Found its freeze of {frozen.at}. "
        "Read its report; what comes after belongs to the next look."
    )


def test_arms_are_unmasked_once(lived: Trial) -> None:
    key = lived.letter_key()
    sentence = refusal(lived, lambda act: act.append(ArmsUnmasked.of(key, "again", "M. Berg")))
    assert sentence == "The arms are unmasked already. Nothing needs to be done."


def test_the_next_snapshot_may_come_in_the_act_that_freezes_the_open_look(trial: Trial) -> None:
    with trial.act() as act:
        acts.receive(act, 1)
    with trial.act() as act:
        acts.freeze(act, 1)
        acts.receive(act, 2)
    assert trial.state().open_look == trial.state().look(2)


def test_results_of_a_frozen_look_may_be_opened_in_another_session(lived: Trial) -> None:
    with lived.act() as act:
        acts.open_results(act, 1, session="second evening")
    assert lived.state().opened(1, "second evening")


def test_a_snapshot_with_a_finding_that_blocks_is_not_stored(trial: Trial) -> None:
    blocking = replace(acts.DOUBT, severity="block")
    body = SnapshotReceived.of(replace(acts.snapshot(1), files=()), [blocking])
    assert refusal(trial, lambda act: act.append(body)).startswith(
        "A snapshot with a finding that blocks. Found "
    )


@pytest.mark.parametrize("dates", [{"cutoff": "soon"}, {"extracted": "2026-02-30"}, {"extracted": ""}])
def test_a_date_is_a_date(trial: Trial, dates: dict[str, str]) -> None:
    body = replace(SnapshotReceived.of(replace(acts.snapshot(1), files=()), []), **dates)
    found = next(iter(dates.values()))
    assert refusal(trial, lambda act: act.append(body)) == f"A time or date that is none. Found {found!r}."


def test_a_time_is_a_time(lived: Trial) -> None:
    first = replace(lived.entries()[0], at="yesterday")
    with pytest.raises(LedgerError, match="A time or date that is none"):
        follow(State(), first)


def test_a_doubt_is_stored_with_its_answer_only(trial: Trial) -> None:
    unanswered = replace(acts.snapshot(1), files=(), acknowledgements=())
    body = SnapshotReceived.of(unanswered, [acts.DOUBT])
    assert refusal(trial, lambda act: act.append(body)).startswith(
        "The doubt 'changed-event' is not answered. Found "
    )


def test_a_note_needs_no_answer(trial: Trial) -> None:
    noted = replace(acts.snapshot(1), files=(), acknowledgements=())
    with trial.act() as act:
        act.append(SnapshotReceived.of(noted, [replace(acts.DOUBT, severity="note")]))
    assert trial.state().look(1).snapshot.findings[0].severity == "note"


# --- amendments ---------------------------------------------------------------------------------------


def amend_as(act: Act, **changes: object) -> None:
    state = act.state
    body = PlanAmended(
        version=state.plan.version + 1,
        plan_digest=act.store(acts.PLAN + b"# changed"),
        changes=(KeyChanged("design.planned_events", "400", "520"),),
        reason="Fewer events than foreseen",
        decided_by="Steering committee",
        results_opened=state.results_opened,
        unmasked=state.unmasked,
        by="M. Berg",
    )
    act.append(replace(body, **changes))


def test_a_look_is_held_under_the_plan_in_force_when_its_snapshot_came(trial: Trial) -> None:
    acts.live(trial, until="freeze the first")
    locked = trial.state().plan_digest
    for do in (amend_as, lambda act: acts.freeze(act, 1), lambda act: acts.receive(act, 2)):
        with trial.act() as act:
            do(act)
    state = trial.state()
    assert [(look.plan.version, look.plan_digest) for look in state.looks] == [
        (1, locked),
        (2, digest(acts.PLAN + b"# changed")),
    ]
    assert state.plan == state.plans[1]
    assert [version.version for version in state.plans] == [1, 2]
    assert trial.content(trial.state().plan_digest) == acts.PLAN + b"# changed"


def test_an_amendment_says_which_results_had_been_opened_before(trial: Trial) -> None:
    acts.live(trial, until="write its report")
    with trial.act() as act:
        amend_as(act)
    amended = trial.state().plan.amended
    assert amended is not None
    assert (amended.results_opened, amended.unmasked) == ((1,), False)


def test_a_written_report_counts_as_results_opened(trial: Trial) -> None:
    for do in (lambda act: acts.receive(act, 1), lambda act: acts.freeze(act, 1)):
        with trial.act() as act:
            do(act)
    assert trial.state().results_opened == ()
    with trial.act() as act:
        acts.write_report(act, 1)
    assert trial.state().results_opened == (1,)


WRONG_AMENDMENTS: dict[str, Do] = {
    "A plan version out of its turn. Found version 3. Accepted: version 2.": lambda act: amend_as(
        act, version=3
    ),
    "An amendment that changes nothing. Give it the changed plan.": lambda act: amend_as(act, changes=()),
    "An amendment that states otherwise what was known when it was made. Found no results opened, arms "
    "unmasked. Accepted: results of look 1 opened, arms unmasked. Amend again.": lambda act: amend_as(
        act, results_opened=()
    ),
    "An amendment that states otherwise what was known when it was made. Found results of look 1 opened, "
    "arms masked. Accepted: results of look 1 opened, arms unmasked. Amend again.": lambda act: amend_as(
        act, unmasked=False
    ),
}


@pytest.mark.parametrize("sentence", WRONG_AMENDMENTS)
def test_what_an_amendment_cannot_state(lived: Trial, sentence: str) -> None:
    assert refusal(lived, WRONG_AMENDMENTS[sentence]) == sentence


def test_the_same_plan_again_is_no_amendment(lived: Trial) -> None:
    sentence = refusal(lived, lambda act: amend_as(act, plan_digest=act.state.plan_digest))
    assert sentence == "An amendment that changes nothing. Give it the changed plan."


# --- refusals, recommendations, errata, backups -------------------------------------------------------


def test_a_refusal_keeps_names_digests_and_sentences_and_not_one_byte(trial: Trial) -> None:
    before = trial._database.value("SELECT count(*) FROM content")
    with trial.act() as act:
        acts.record_refusal(act)
    body = read_body(trial.entries()[-1])
    assert isinstance(body, RefusalRecorded)
    assert body.files[0].digest == digest(acts.extract(9))
    assert body.findings[0].sentence == str(acts.DOUBT)
    assert list(body.contents()) == []
    assert trial._database.value("SELECT count(*) FROM content") == before
    assert trial.state().next_number == 1


def test_a_refusal_needs_a_finding_that_blocks(trial: Trial) -> None:
    body = RefusalRecorded("planned", "2026-01-09", None, (), (FindingKept.of(acts.DOUBT),), "M. Berg")
    assert refusal(trial, lambda act: act.append(body)) == (
        "A refusal without a finding that blocks. Accepted: an extract that cannot be used. "
        "Receive it instead."
    )


def test_a_recommendation_rests_on_a_frozen_look(trial: Trial) -> None:
    acts.live(trial, until="freeze the first")
    assert refusal(trial, lambda act: acts.recommend(act, 1)) == "Look 1 is not frozen. Freeze it first."


def test_a_committee_may_recommend_again(lived_on: Trial) -> None:
    with lived_on.act() as act:
        act.append(Recommendation(2, "stop for benefit", "Reconsidered", "2026-01-21", "M. Berg"))
    kinds = [entry.kind for entry in lived_on.entries()]
    assert kinds.count("recommendation") == 2


def test_a_recommendation_has_the_day_of_its_meeting(lived: Trial) -> None:
    body = Recommendation(2, "continue", "No concern", "soon", "M. Berg")
    assert refusal(lived, lambda act: act.append(body)) == "A time or date that is none. Found 'soon'."


@pytest.mark.parametrize("number", [0, 10, -1])
def test_an_erratum_names_an_entry(lived: Trial, number: int) -> None:
    assert refusal(lived, lambda act: act.append(Erratum(number, "No", "M. Berg"))) == (
        f"An erratum to an entry that does not exist. Found entry {number}. "
        "Accepted: an entry from 1 to 9. Name the entry that is to be corrected by its number."
    )


def test_an_erratum_leaves_the_entry_as_it_was(lived: Trial) -> None:
    before = lived.entries()
    with lived.act() as act:
        acts.correct(act)
    assert lived.entries()[:-1] == before


def test_a_backup_of_another_head_is_not_recorded(lived: Trial) -> None:
    body = Backup("copy.trial", "0" * 64, lived.head(), 8, "M. Berg")
    assert refusal(lived, lambda act: act.append(body)) == (
        "The history grew while it was copied. Found entry 9. Accepted: entry 8 as the last. "
        "Make the backup again."
    )


# --- the clock ----------------------------------------------------------------------------------------


def test_a_clock_that_goes_back_is_a_doubt_and_stays_recorded(path: Path) -> None:
    hour = [10]
    settings = Settings(clock=lambda: datetime(2026, 1, 15, hour[0], tzinfo=UTC))
    with acts.start(path, settings) as trial:
        hour[0] = 8
        with trial.act() as act:
            acts.receive(act, 1)
        (doubt,) = trial.take_clock_doubts()
        assert str(doubt) == (
            "The clock went back: entry 2 carries 2026-01-15T08:00:00Z, the one before it "
            "2026-01-15T10:00:00Z. Check the clock of this machine; if a recorded time is wrong, "
            "say so in an erratum."
        )
        assert trial.take_clock_doubts() == ()  # told once
        with trial.act() as act:
            acts.open_results(act, 1)
        assert trial.take_clock_doubts() == ()
        assert trial.check_chain() == ()  # a doubt, no damage
        assert trial.state().clock_doubts == (doubt,)  # for ever


def test_a_clock_that_stands_still_is_no_doubt(path: Path) -> None:
    settings = Settings(clock=lambda: datetime(2026, 1, 15, 9, tzinfo=UTC))
    with acts.start(path, settings) as trial:
        acts.live(trial)
        assert trial.state().clock_doubts == ()


def test_every_kind_of_entry_has_its_rule() -> None:
    assert set(BODIES.values()) == set(advance.registry) - {object}


@pytest.mark.parametrize(
    ("body", "found"),
    [
        ('{"look":1,"session":"s"}', "no field 'view'"),
        ('{"look":1,"more":2,"session":"s","view":"masked"}', "the unknown field 'more'"),
        ('{"look":"1","session":"s","view":"masked"}', "'1' in place of <class 'int'>"),
        ('{"look":true,"session":"s","view":"masked"}', "True in place of <class 'int'>"),
        ('{"look":1,"session":"s","view":"open"}', "'open' in place of typing.Literal['masked', 'unmasked']"),
        ("[]", "[] in place of the fields of ResultsOpened"),
        ("{", "Text that is not strict JSON in entry 2"),
    ],
)
def test_a_body_that_does_not_read_is_told(body: str, found: str) -> None:
    entry = Entry(2, "2026-01-15T09:00:00Z", "results opened", body, "0" * 64, "0" * 64)
    with pytest.raises(LedgerChanged) as told:
        follow(State(head=Head(1, "0" * 64)), entry)
    assert f"A body that no such entry has in entry 2. Found {found}" in str(told.value)


def test_an_entry_of_an_unknown_kind_is_told() -> None:
    with pytest.raises(LedgerChanged, match=r"An entry of an unknown kind in entry 1\. Found 'plan torn up'"):
        follow(State(), Entry(1, "", "plan torn up", "{}", "0" * 64, "0" * 64))


def test_the_state_is_the_same_folded_at_once_or_in_parts(lived: Trial) -> None:
    entries = lived.entries()
    for cut in range(len(entries) + 1):
        assert fold(entries[cut:], fold(entries[:cut])) == fold(entries) == lived.state()


def test_a_trial_may_start_unmasked(tmp_path: Path, settings: Settings) -> None:
    with acts.start(tmp_path / "open.trial", settings, masked=False) as trial:
        assert trial.state().letters == trial.letter_key().letters
        assert [entry.kind for entry in trial.entries()] == ["plan locked", "arms unmasked"]
        assert len({entry.at for entry in trial.entries()}) == 1


def test_the_key_that_unmasks_is_the_one_committed_to(trial: Trial) -> None:
    key, state = trial.letter_key(), trial.state()
    swapped = LetterKey(Letters(key.letters.experimental, key.letters.control), key.salt)
    assert key.commitment == state.letters_commitment != swapped.commitment
    assert state.letters is None
    sentence = refusal(trial, lambda act: act.append(ArmsUnmasked.of(swapped, "why", "M. Berg")))
    assert sentence == "These arm letters are not the ones committed to when the plan was locked."


# --- looks held before the file -----------------------------------------------------------------------


@pytest.fixture
def after_two(tmp_path: Path) -> Iterator[Trial]:
    with acts.start(tmp_path / "after.trial", acts.ticking_settings(), looks_held_before=2) as trial:
        yield trial


def test_looks_are_counted_on_from_those_held_before(after_two: Trial) -> None:
    assert refusal(after_two, lambda act: acts.receive(act, 1)) == (
        "A snapshot out of its turn. Found snapshot 1. Accepted: snapshot 3."
    )
    with after_two.act() as act:
        acts.receive(act, 3)
    state = after_two.state()
    assert (state.first_number, state.next_number) == (3, 4)
    assert state.open_look is state.look(3)
    assert after_two.snapshot(3).number == 3


def test_a_look_held_before_is_told_from_one_that_does_not_exist(after_two: Trial) -> None:
    before = refusal(after_two, lambda act: act.append(ResultsOpened(2, "s", "masked")))
    assert before == (
        "Look 2 was held before this trial file. "
        "Found no snapshot of it, and so no sheets, freeze or report. Accepted: look 3 or a later one. "
        "Read what is known of it in the plan, under [[held]]."
    )
    for number in (0, 3):
        sentence = refusal(
            after_two, lambda act, number=number: act.append(ResultsOpened(number, "s", "masked"))
        )
        assert sentence == NO_LOOK.format(number)


def test_a_lock_of_before_there_were_such_looks_has_none(trial: Trial) -> None:
    entry = trial.entries()[0]
    older = entry.body.replace('"looks_held_before":0,', "")
    assert older != entry.body
    body = read_body(replace(entry, body=older))
    assert isinstance(body, PlanLocked)
    assert body.looks_held_before == 0


def test_fewer_than_no_looks_held_before_are_refused(trial: Trial) -> None:
    body = read_body(trial.entries()[0])
    assert isinstance(body, PlanLocked)
    entry = Entry.following(State().head, trial.entries()[0].at, replace(body, looks_held_before=-1))
    with pytest.raises(LedgerError, match=r"Fewer than no looks held before\. Found -1"):
        follow(State(), entry)
