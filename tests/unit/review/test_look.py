"""One look computed: which look is which, what later looks rest on, denominators, pooled and compared."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from datetime import date

import numpy as np
import pytest

from app.model.boundary import LookAsUsed
from app.model.extract import LookKind, PooledSample
from app.model.look import LookResult
from app.model.values import Absent, read_only
from app.record.canonical import parse_strict
from app.record.text import record_bytes
from app.review import LookDeclared, as_used, as_used_of_record, review_look, review_pooled
from app.review.as_used import bound_of_record
from app.review.counts import calendar_counts, or_reason, strata_counts, times_of
from app.review.look import fractions_to_come, planned_fraction
from app.survival import logrank
from app.views.closed import full_view
from app.views.record import look_record
from tests.unit.review.invented_trial import CUTOFFS, patients, plan

LOOKS = (0.25, 0.5, 0.75, 1.0)


def review(
    cutoff: date, past: Sequence[LookAsUsed] = (), kind: LookKind = "planned", number: int = 1
) -> LookResult:
    return review_look(plan(), patients().at(cutoff).sample(), LookDeclared(number, kind, cutoff), past)


def life(*kinds: LookKind, cutoffs: Sequence[date] = CUTOFFS) -> list[LookResult]:
    looks: list[LookResult] = []
    for number, (kind, cutoff) in enumerate(zip(kinds, cutoffs, strict=False), 1):
        looks.append(review(cutoff, [as_used(look) for look in looks], kind, number))
    return looks


# --- which look is which --------------------------------------------------------------------------------


def test_the_nth_planned_look_uses_up_the_nth_planned_fraction() -> None:
    assert planned_fraction(LOOKS, ["planned"]) == 0.25
    assert planned_fraction(LOOKS, ["planned", "safety", "unplanned", "planned"]) == 0.5
    assert planned_fraction(LOOKS, ["planned", "safety"]) is None
    assert planned_fraction(LOOKS, ["planned", "final"]) == 1.0
    assert planned_fraction(LOOKS, ["planned"] * 5) is None


def test_fractions_to_come_lie_beyond_the_information_and_are_not_used_up() -> None:
    assert fractions_to_come(LOOKS, ["planned"], 0.3) == (0.5, 0.75, 1.0)
    assert fractions_to_come(LOOKS, ["planned"], 0.6) == (0.75, 1.0)
    assert fractions_to_come(LOOKS, ["unplanned"], 0.1) == LOOKS
    assert fractions_to_come(LOOKS, ["planned"] * 5, 0.9) == (1.0,)


def test_a_look_is_final_when_declared_so_or_at_full_information() -> None:
    kinds: list[tuple[LookKind, date, bool]] = [
        ("planned", CUTOFFS[1], False),
        ("final", CUTOFFS[1], True),
        ("planned", CUTOFFS[2], True),  # 82 of 80 events
        ("safety", CUTOFFS[2], False),
    ]
    for kind, cutoff, final in kinds:
        assert review(cutoff, kind=kind).final is final


def test_a_final_look_spends_all_that_is_left_and_shows_nothing_to_come() -> None:
    first, last = life("planned", "final")
    assert last.bound.alpha_spent == 0.025
    assert last.bound.alpha_spent_here == pytest.approx(0.025 - first.bound.alpha_spent, abs=1e-15)
    assert last.planned == ()


def test_a_safety_look_spends_nothing_and_its_share_is_caught_up() -> None:
    """The spend after it is what it would have been without it."""
    with_safety, without = (
        life("planned", "safety", "planned"),
        life("planned", "planned", cutoffs=CUTOFFS[::2]),
    )
    assert isinstance(with_safety[1].bound.efficacy_z, Absent)
    assert with_safety[1].bound.alpha_spent_here == 0.0
    assert with_safety[1].bound.alpha_spent == with_safety[0].bound.alpha_spent
    assert with_safety[2].bound.efficacy_z == without[1].bound.efficacy_z
    assert with_safety[2].bound.alpha_spent_here == without[1].bound.alpha_spent_here


def test_events_that_fell_are_no_new_information_and_nothing_is_unspent() -> None:
    first, again = life("planned", "planned", cutoffs=(CUTOFFS[1], CUTOFFS[0]))
    assert again.information.events < first.information.events
    assert isinstance(again.bound.efficacy_z, Absent)
    assert again.bound.alpha_spent == first.bound.alpha_spent


def test_the_bounds_ahead_are_those_of_the_plan_s_looks_were_they_held_so() -> None:
    look = life("planned", "planned")[1]
    assert [(bound.number, bound.information_fraction, bound.events) for bound in look.planned] == [
        (3, 0.75, 60),
        (4, 1.0, 80),
    ]
    assert look.planned[-1].alpha_spent == 0.025


# --- what later looks rest on ---------------------------------------------------------------------------


@pytest.mark.parametrize("kinds", [("planned", "planned", "planned"), ("planned", "safety", "final")])
def test_a_look_read_back_from_its_record_is_the_look_as_used(kinds: tuple[LookKind, ...]) -> None:
    """Through the text of the record and back, to the last bit; reasons too."""
    for look in life(*kinds):
        record = parse_strict(record_bytes(look_record(full_view(look, plan()))))
        assert as_used_of_record(record) == as_used(look)
        assert bound_of_record(record) == look.bound


def test_a_look_without_a_test_is_used_without_a_z() -> None:
    sample = patients().at(CUTOFFS[0]).sample()
    silent = replace(sample, event=read_only(np.zeros(sample.time.size), np.bool_))
    look = review_look(plan(), silent, LookDeclared(1, "planned"), ())
    record = look_record(full_view(look, plan()))
    assert as_used(look).z is None
    assert as_used_of_record(record) == as_used(look)


def test_the_bound_does_not_depend_on_what_was_crossed_before() -> None:
    """So that a masked look reads the same bound in both readings."""
    past = [as_used(look) for look in life("planned", "planned")]
    bounds = [
        review(CUTOFFS[2], [past[0], replace(past[1], crossed=crossed)], number=3).bound  # type: ignore[arg-type]
        for crossed in ("none", "efficacy", "control")
    ]
    assert bounds[0] == bounds[1] == bounds[2]


# --- numbers of the look --------------------------------------------------------------------------------


def test_the_test_is_the_stratified_one_and_the_plain_one_stands_beside() -> None:
    seen = patients().at(CUTOFFS[1])
    look = review(CUTOFFS[1])
    direct = logrank(seen.time, seen.event, seen.experimental, stratum=seen.region)
    plain = logrank(seen.time, seen.event, seen.experimental)
    for computed, expected in ((look.logrank, direct), (look.logrank_unstratified, plain)):
        assert not isinstance(computed, Absent)
        assert computed.z == pytest.approx(expected.z, rel=1e-14)
        assert computed.observed == expected.observed
        assert computed.variance == pytest.approx(expected.variance, rel=1e-14)
        assert computed.chi_square == pytest.approx(computed.z**2, rel=1e-13)
        assert computed.p_one_sided == pytest.approx(math.erfc(computed.z / math.sqrt(2)) / 2, rel=1e-12)


def test_both_sides_of_the_comparison_add_up() -> None:
    look = review(CUTOFFS[1])
    one, other = look.logrank, look.mirrored.logrank
    assert not isinstance(one, Absent)
    assert not isinstance(other, Absent)
    assert one.observed + other.observed == look.information.events
    assert one.expected + other.expected == pytest.approx(look.information.events, rel=1e-14)
    assert one.z == -other.z
    assert [part.variance for part in one.strata] == [part.variance for part in other.strata]


def test_the_information_is_events_and_the_variance_ratio_v_over_d_p_q() -> None:
    look = review(CUTOFFS[1])
    information = look.information
    assert information.fraction == 52 / 80
    assert look.information_used == 52.0
    assert not isinstance(information.score_variance, Absent)
    assert information.variance_ratio == pytest.approx(information.score_variance / (52 * 0.25), rel=1e-15)


def test_the_bound_as_a_hazard_ratio_uses_the_variance_observed() -> None:
    look = review(CUTOFFS[1])
    variance = look.information.score_variance
    assert not isinstance(variance, Absent)
    assert not isinstance(look.bound.efficacy_z, Absent)
    at_bound = math.exp(-look.bound.efficacy_z / math.sqrt(variance))
    assert look.bound.efficacy_hazard_ratio == pytest.approx(at_bound, rel=1e-14)


def test_when_the_event_is_good_everything_turns_round_but_the_ratio() -> None:
    """z favours experimental when it has more events; the bound is a ratio above 1."""
    good = plan(('event_is = "bad"', 'event_is = "good"'), ("hazard_ratio = 0.5", "hazard_ratio = 2.0"))
    sample = patients().at(CUTOFFS[1]).sample()
    bad_look, good_look = (
        review_look(under, sample, LookDeclared(1, "planned"), ()) for under in (plan(), good)
    )
    assert not isinstance(bad_look.logrank, Absent)
    assert not isinstance(good_look.logrank, Absent)
    assert good_look.logrank.z == -bad_look.logrank.z
    assert good_look.cox == bad_look.cox
    assert good_look.bound.efficacy_z == bad_look.bound.efficacy_z
    assert not isinstance(bad_look.bound.efficacy_hazard_ratio, Absent)
    turned = 1 / bad_look.bound.efficacy_hazard_ratio
    assert good_look.bound.efficacy_hazard_ratio == pytest.approx(turned, rel=1e-14)


def test_a_reason_takes_the_place_of_what_cannot_be_estimated() -> None:
    assert or_reason(lambda: 2.5) == 2.5
    alone = np.ones(3, dtype=bool)
    assert or_reason(lambda: logrank([1, 2, 3], alone, alone)) == Absent("all subjects are in one arm")


# --- counts ---------------------------------------------------------------------------------------------


def test_the_calendar_counts_every_day_on_which_something_happened() -> None:
    """Counted anew, day by day."""
    sample = patients().at(CUTOFFS[0]).sample()
    counts = calendar_counts(sample)
    assert counts is not None
    assert sample.start_day is not None
    assert sample.end_day is not None
    for day, randomised, events in zip(counts.day, counts.randomised, counts.events, strict=True):
        assert randomised == (sample.start_day <= day).sum()
        assert events == (sample.event & (sample.end_day <= day)).sum()
    assert (counts.randomised[-1], counts.events[-1]) == (128, 30)
    assert calendar_counts(replace(sample, start_day=None)) is None


def test_every_subject_is_counted_in_one_stratum_and_one_arm() -> None:
    seen = patients().at(CUTOFFS[1])
    for index, stratum in enumerate(strata_counts(seen.sample())):
        here = seen.region == index
        assert stratum.subjects == here.sum()
        assert stratum.events == (here & seen.event).sum()
        assert stratum.experimental_subjects == (here & seen.experimental).sum()
        assert stratum.experimental_events == (here & seen.experimental & seen.event).sum()


def test_times_in_another_unit_are_merged_where_they_differ_by_rounding_only() -> None:
    sample = patients().at(CUTOFFS[0]).sample()
    years = replace(sample, time=read_only([0.3, 0.1 + 0.2] * 64, np.float64), time_unit="years")
    assert set(times_of(years).tolist()) == {0.3}
    assert times_of(sample) is sample.time


def test_the_pooled_look_has_the_counts_of_the_closed_one() -> None:
    closed, sample = review(CUTOFFS[1]), patients().at(CUTOFFS[1]).sample()
    pooled = review_pooled(
        plan(),
        PooledSample(
            sample.parameter,
            sample.time,
            sample.event,
            sample.stratum,
            sample.stratum_labels,
            "days",
            sample.start_day,
            sample.end_day,
        ),
        LookDeclared(1, "planned", CUTOFFS[1]),
        (),
    )
    information = closed.information
    assert (pooled.subjects, pooled.events, pooled.fraction) == (160, 52, information.fraction)
    assert pooled.person_time == information.control.person_time + information.experimental.person_time
    assert pooled.strata == tuple((each.label, each.subjects, each.events) for each in information.strata)
    assert pooled.curve.at_risk[0] == 160
