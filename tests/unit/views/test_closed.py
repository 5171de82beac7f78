"""The closed view: orientation, both readings, what stands after a crossing, what a masked one never says."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from app.model.boundary import LookAsUsed, Verdict
from app.model.look import LookResult
from app.model.plan import HeldLook, Plan
from app.model.values import Absent, read_only
from app.review import LookDeclared, as_used, review_look
from app.review.held import held_looks
from app.views.closed import ClosedView, Letters, full_view, masked_view, unmasked_view
from tests.unit.review.invented_trial import CONTROL, CUTOFFS, EXPERIMENTAL, patients, plan
from tests.unit.sheets.invented_looks import A_IS_CONTROL, A_IS_EXPERIMENTAL, TWO_SIDED, held, life


def masked(look: LookResult, letters: Letters = A_IS_CONTROL, sides: int = 1) -> ClosedView:
    return masked_view(look, plan(*([TWO_SIDED] if sides == 2 else [])), letters)


def test_unmasked_the_orientation_is_experimental_against_control() -> None:
    view = held(cutoffs=CUTOFFS[:1])[0].view()
    assert (view.of.value, view.against.value) == (EXPERIMENTAL, CONTROL)
    assert view.logrank == view.look.logrank
    assert view.readings[0].experimental == EXPERIMENTAL


@pytest.mark.parametrize("letters", [A_IS_CONTROL, A_IS_EXPERIMENTAL])
def test_masked_the_orientation_is_a_against_b_with_the_patients_of_each_letter(letters: Letters) -> None:
    view = held(cutoffs=CUTOFFS[:1])[0].view(letters)
    control, experimental = view.look.information.control, view.look.information.experimental
    assert (view.of.value, view.against.value) == ("A", "B")
    first = control if letters.control == "A" else experimental
    assert view.of.counts == first
    assert not isinstance(view.logrank, Absent)
    assert view.logrank.observed == first.events
    assert [stratum.arms[0][0] for stratum in view.strata] == [
        stratum.subjects - stratum.experimental_subjects
        if letters.control == "A"
        else stratum.experimental_subjects
        for stratum in view.look.information.strata
    ]


def test_masked_ratios_are_of_a_to_b() -> None:
    look = held(cutoffs=CUTOFFS[:1])[0]
    unmasked, mask = look.view().cox, look.view(A_IS_CONTROL).cox
    assert not isinstance(unmasked, Absent)
    assert not isinstance(mask, Absent)
    assert mask.hazard_ratio == pytest.approx(1 / unmasked.hazard_ratio, rel=1e-12)
    assert mask.ci_low == pytest.approx(1 / unmasked.ci_high, rel=1e-12)
    assert mask.ci_high == pytest.approx(1 / unmasked.ci_low, rel=1e-12)
    assert mask.std_error == pytest.approx(unmasked.std_error, rel=1e-12)


def test_each_reading_has_its_own_verdict() -> None:
    """Control ahead by 4 standard errors: crossed for whoever takes it for experimental."""
    view = masked(life(0.0, -4.0)[1])
    a, b = view.readings
    assert (a.z, b.z) == (4.0, -4.0)
    assert (a.verdict, b.verdict) == (Verdict("efficacy", 2), Verdict("none", None))


def test_a_crossing_at_an_earlier_look_stands_in_its_reading_only() -> None:
    look = life(0.0, -4.0, 0.5)[2]
    a, b = masked(look).readings
    assert (a.verdict, b.verdict) == (Verdict("none", 2), Verdict("none", None))
    assert [each.crossed for each in a.history] == ["none", "efficacy"]
    assert [each.crossed for each in b.history] == ["none", "none"]
    assert [each.z for each in a.history] == [0.0, 4.0]
    assert not isinstance(masked(look).look.bound.efficacy_z, Absent)  # a test still, in the other reading


def test_the_other_reading_can_cross_later_on() -> None:
    look = life(0.0, -4.0, 4.0)[2]
    a, b = masked(look).readings
    assert (a.verdict, b.verdict) == (Verdict("none", 2), Verdict("efficacy", 3))


def test_once_both_readings_have_crossed_no_bound_is_a_test() -> None:
    looks = life(0.0, -4.0, 4.0, 1.0)
    view = masked(looks[3])
    assert isinstance(view.look.bound.efficacy_z, Absent)
    assert (
        view.look.bound.efficacy_z.reason
        == "the boundary was crossed at look 3: over-running, with no second test"
    )
    assert view.look.bound.alpha_spent == looks[2].bound.alpha_spent


def test_two_sided_both_readings_cross_at_one_look_and_on_either_side() -> None:
    a, b = masked(life(0.0, -4.0, sides=2)[1], sides=2).readings
    assert (a.verdict, b.verdict) == (Verdict("efficacy", 2), Verdict("control", 2))
    over = masked(life(0.0, -4.0, 0.1, sides=2)[2], sides=2)
    assert isinstance(over.look.bound.efficacy_z, Absent)
    assert over.look.planned == ()


def test_after_a_crossing_the_unmasked_view_has_no_second_test_and_spends_nothing() -> None:
    """Also the looks held between the crossing and this one stand without a bound."""
    looks = life(0.0, 4.0, -4.0, 1.0)
    view = unmasked_view(looks[3], plan(), A_IS_CONTROL)
    third = view.readings[0].history[2]
    reason = Absent("the boundary was crossed at look 2: over-running, with no second test")
    assert view.look.bound.efficacy_z == third.efficacy_z == third.efficacy_hazard_ratio == reason
    assert view.look.bound.alpha_spent == third.alpha_spent == looks[1].bound.alpha_spent
    assert view.look.bound.alpha_spent_here == 0.0
    assert view.look.planned == ()
    assert view.readings[0].verdict == Verdict("none", 2)


def test_the_look_that_crosses_keeps_its_bound_and_shows_no_further_ones() -> None:
    looks = life(0.0, 4.0)
    view = unmasked_view(looks[1], plan(), A_IS_CONTROL)
    assert view.look.bound == looks[1].bound
    assert view.look.planned == ()
    assert looks[1].planned != ()


def test_the_full_view_keeps_every_bound_for_both_readings() -> None:
    looks = life(0.0, 4.0, -4.0)
    view = full_view(looks[2], plan())
    assert view.look is looks[2]
    assert not isinstance(view.look.bound.efficacy_z, Absent)
    assert view.readings[0].verdict == Verdict("none", 2)


def test_a_z_of_zero_is_turned_to_zero_and_not_to_minus_zero() -> None:
    """-0.0 in a record would tell which numbers were turned."""
    view = masked(life(0.0, 0.0)[1])
    zs = [reading.z for reading in view.readings] + [each.z for each in view.readings[0].history]
    assert [repr(z) for z in zs] == ["0.0"] * 3


@pytest.mark.parametrize("letters", [A_IS_CONTROL, A_IS_EXPERIMENTAL])
def test_a_reason_names_the_arms_by_letter(letters: Letters) -> None:
    """All events in one arm, so no finite ratio: the masked reason must not say which part that arm plays."""
    seen = patients().at(CUTOFFS[0])
    sample = replace(seen.sample(), event=read_only(seen.event & ~seen.experimental, np.bool_))
    look = review_look(plan(), sample, LookDeclared(1, "planned"), ())
    unmasked, lettered = unmasked_view(look, plan(), letters).cox, masked_view(look, plan(), letters).cox
    assert isinstance(unmasked, Absent)
    assert isinstance(lettered, Absent)
    assert "was in the control arm, so the likelihood rises as the hazard ratio goes to 0" in unmasked.reason
    limit = "infinity" if letters.control == "A" else "0"
    said = f"was in arm {letters.control}, so the likelihood rises as the hazard ratio goes to {limit}"
    assert said in lettered.reason


def test_a_plan_that_starts_unmasked_is_read_by_name_from_the_first_look_on() -> None:
    look = held(plan(("masked = true", "masked = false")), cutoffs=CUTOFFS[:1])[0]
    assert [arm.value for arm in look.view().arms] == [EXPERIMENTAL, CONTROL]


def test_history_is_that_of_the_looks_as_used() -> None:
    looks = held(cutoffs=CUTOFFS[:3])
    history: tuple[LookAsUsed, ...] = looks[2].view().readings[0].history
    assert history == tuple(as_used(each.result) for each in looks[:2])


def after_a_held_look(z: float | None) -> tuple[LookResult, Plan]:
    under = replace(plan(), held=(HeldLook(1, 10, z, 4.0, 0.00001, "Charter"),))
    before, compared = held_looks(under)
    sample = patients().at(CUTOFFS[0]).sample()
    look = review_look(under, sample, LookDeclared(2, "planned"), before)
    return replace(look, held=compared), under


def test_masked_a_look_held_before_reads_the_same_whichever_arm_is_experimental() -> None:
    """Its z is of experimental against control in either reading; beside A against B it is not shown."""
    look, under = after_a_held_look(1.5)
    view = masked_view(look, under, A_IS_CONTROL)
    assert [reading.history[0].z for reading in view.readings] == [None, None]
    assert (view.look.past[0].z, view.look.held[0].z) == (None, None)
    other = masked_view(after_a_held_look(-1.5)[0], under, A_IS_CONTROL)
    assert (other.readings[0].history, other.look.past) == (view.readings[0].history, view.look.past)
    assert unmasked_view(look, under, A_IS_CONTROL).readings[0].history[0].z == 1.5
    assert full_view(look, under).look.held[0].z == 1.5


def test_masked_a_crossing_before_ends_the_test_in_both_readings() -> None:
    """No file with such a look is locked masked; were one, the letters would not be in what is shown."""
    look, under = after_a_held_look(4.5)
    for letters in (A_IS_CONTROL, A_IS_EXPERIMENTAL):
        view = masked_view(look, under, letters)
        assert [reading.verdict for reading in view.readings] == [Verdict("none", 1)] * 2
        assert isinstance(view.look.bound.efficacy_z, Absent)
