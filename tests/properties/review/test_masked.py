"""Whoever sees a masked look cannot tell, by whatever rule, which arm is which."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from app.model.extract import LookKind, Sample
from app.model.look import LookResult
from app.model.plan import HeldLook, Plan
from app.model.values import Absent, read_only
from app.record.text import record_bytes
from app.review import LookDeclared, as_used, review_look
from app.review.held import held_looks
from app.views.closed import ClosedView, Letters, full_view, masked_view, unmasked_view
from app.views.record import looks_record
from tests.strategies import TwoArmSample, two_arm_samples
from tests.unit.review.invented_trial import plan

ONE_SIDED = plan(("planned_events = 80", "planned_events = 20"), ("planned_subjects = 160", ""))
TWO_SIDED = replace(ONE_SIDED, design=replace(ONE_SIDED.design, alpha=0.4, sides=2))
GOOD_EVENT = replace(ONE_SIDED, endpoint=replace(ONE_SIDED.endpoint, event_is="good"))
KEEN = replace(ONE_SIDED, design=replace(ONE_SIDED.design, alpha=0.4))  # crosses now and then

BEFORE = (HeldLook(1, 1, 0.7, 6.0, 0.0, "Charter"),)
HELD = replace(ONE_SIDED, held=BEFORE)
OVER = replace(ONE_SIDED, held=(replace(BEFORE[0], z=6.5),))  # crossed before; never locked masked

plans = st.sampled_from([ONE_SIDED, TWO_SIDED, GOOD_EVENT, KEEN, HELD, OVER])
kinds = st.sampled_from(["planned", "planned", "planned", "unplanned", "safety", "final"])
lives = st.lists(st.tuples(two_arm_samples(), kinds), min_size=1, max_size=4)
Life = Sequence[tuple[TwoArmSample, LookKind]]
few = settings(max_examples=50)  # each lives through up to four looks


def sample_of(drawn: TwoArmSample, *, exchanged: bool) -> Sample:
    return Sample(
        parameter="RELAPSE",
        subject=tuple(map(str, range(drawn.size))),
        time=read_only(drawn.time, np.float64),
        event=read_only(drawn.event, np.bool_),
        experimental=read_only(drawn.experimental != exchanged, np.bool_),
        stratum=read_only(drawn.stratum, np.int64),
        stratum_labels=("first", "second", "third"),
        time_unit="as given",
    )


def looks(under: Plan, life: Life, *, exchanged: bool = False) -> list[LookResult]:
    held: list[LookResult] = []
    before, compared = held_looks(under)
    for number, (drawn, kind) in enumerate(life, 1 + len(before)):
        past = [*before, *(as_used(look) for look in held)]
        sample = sample_of(drawn, exchanged=exchanged)
        look = review_look(under, sample, LookDeclared(number, kind), past)
        held.append(replace(look, held=compared))
    return held


def text(views: Sequence[ClosedView]) -> bytes:
    return record_bytes(looks_record("look", views, run_at=""))


@few
@given(plans, lives)
def test_exchanging_arms_and_letters_leaves_every_byte_of_the_masked_record(under: Plan, life: Life) -> None:
    """The same patients are arm A; whether they were given control or experimental shows nowhere."""
    as_control = [masked_view(look, under, Letters("A")) for look in looks(under, life)]
    as_experimental = [masked_view(look, under, Letters("B")) for look in looks(under, life, exchanged=True)]
    assert text(as_control) == text(as_experimental)
    assert b"control arm" not in text(as_control)  # nor does a reason name an arm by its part
    assert b"experimental arm" not in text(as_control)


@few
@given(plans, lives)
def test_exchanging_the_arms_turns_z_to_the_last_bit(under: Plan, life: Life) -> None:
    for look, other in zip(looks(under, life), looks(under, life, exchanged=True), strict=True):
        if isinstance(look.logrank, Absent) or isinstance(other.logrank, Absent):
            assert look.logrank == other.logrank
            continue
        assert look.logrank.z == -other.logrank.z
        assert look.logrank.variance == other.logrank.variance
        assert look.logrank.chi_square == other.logrank.chi_square
        assert look.bound == other.bound


@few
@given(plans, lives, st.sampled_from("AB"))
def test_the_reading_that_is_true_says_what_the_unmasked_view_says(
    under: Plan, life: Life, control: str
) -> None:
    letters = Letters(control)  # type: ignore[arg-type]
    for look in looks(under, life):
        masked, full = masked_view(look, under, letters), full_view(look, under).readings[0]
        (true,) = [each for each in masked.readings if each.experimental == letters.experimental]
        assert true.verdict == full.verdict == unmasked_view(look, under, letters).readings[0].verdict
        assert [held.crossed for held in true.history] == [held.crossed for held in look.past]
        seen = [None if held.number in look.held_before else held.z for held in look.past]
        assert [held.z for held in true.history] == seen


@few
@given(plans, lives)
def test_both_readings_mirror_each_other(under: Plan, life: Life) -> None:
    """The reading of B is that of A in the trial whose arms are exchanged."""
    exchanged = looks(under, life, exchanged=True)
    for look, other in zip(looks(under, life), exchanged, strict=True):
        first = masked_view(look, under, Letters("B")).readings[1]
        second = masked_view(other, under, Letters("B")).readings[0]
        assert replace(first, experimental="") == replace(second, experimental="")


@few
@given(plans, lives)
def test_after_the_first_crossing_nothing_crosses_and_the_full_view_keeps_the_bounds(
    under: Plan, life: Life
) -> None:
    held = looks(under, life)
    firsts = {look.verdict.first_crossed for look in held} - {None}
    assert len(firsts) <= 1
    for look in held:
        assert full_view(look, under).look.bound == look.bound
        if firsts and look.number > min(firsts):
            view = unmasked_view(look, under, Letters("A"))
            assert view.readings[0].verdict.crossed == "none"
            assert view.readings[0].verdict.first_crossed == min(firsts)
            assert isinstance(view.look.bound.efficacy_z, Absent)
            (at_crossing,) = [each for each in view.readings[0].history if each.number == min(firsts)]
            assert view.look.bound.alpha_spent == at_crossing.alpha_spent
            later = [each for each in view.readings[0].history if each.number > min(firsts)]
            assert all(isinstance(each.efficacy_z, Absent) for each in later)
            assert {each.alpha_spent for each in later} <= {view.look.bound.alpha_spent}
