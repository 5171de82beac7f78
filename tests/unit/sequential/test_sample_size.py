"""Events, subjects and duration at their edges; their values stand in tests/published."""

from __future__ import annotations

import math

import pytest

from app.errors import DesignInvalid
from app.sequential.sample_size import (
    Recruitment,
    duration_for_events,
    expected_events,
    freedman_events,
    lachin_foulkes_subjects,
    schoenfeld_events,
)

LEVELS = {"alpha_one_side": 0.025, "power": 0.9}


def test_turning_ratio_and_arms_over_changes_no_number_of_events() -> None:
    for formula in (schoenfeld_events, freedman_events):
        there = formula(0.7, experimental_share=0.25, **LEVELS)
        assert formula(1.0 / 0.7, experimental_share=0.75, **LEVELS) == pytest.approx(there, rel=1e-12)


def test_schoenfeld_and_freedman_meet_for_ratios_near_one() -> None:
    """Freedman over Schoenfeld is 1 + log^2(HR) / 6 and higher powers, for equal arms."""
    ratio = 0.95
    quotient = freedman_events(ratio, **LEVELS) / schoenfeld_events(ratio, **LEVELS)
    assert quotient == pytest.approx(1.0 + math.log(ratio) ** 2 / 6.0, abs=1e-7)


def test_everybody_has_an_event_in_the_end() -> None:
    assert Recruitment(2.0, 500.0).event_probability(0.3) == pytest.approx(1.0, abs=1e-12)
    assert Recruitment(2.0, 500.0, dropout_hazard=0.1).event_probability(0.3) == pytest.approx(
        0.75, abs=1e-12
    )


def test_entry_all_at_once_is_the_limit_of_short_entry() -> None:
    at_once = Recruitment(0.0, 5.0, 0.02).event_probability(0.2)
    assert at_once == pytest.approx((0.2 / 0.22) * (1.0 - math.exp(-0.22 * 5.0)), rel=1e-14)
    assert Recruitment(1e-9, 5.0, 0.02).event_probability(0.2) == pytest.approx(at_once, rel=1e-8)


@pytest.mark.parametrize("dropout", [0.0, 0.05])
@pytest.mark.parametrize("events", [1.0, 60.0, 150.0, 240.0])
def test_the_duration_found_has_the_events_asked_for(events: float, dropout: float) -> None:
    trial = {"control_hazard": 0.3, "hazard_ratio": 0.7, "experimental_share": 0.4}
    total = duration_for_events(events, 376.0, accrual=3.0, dropout_hazard=dropout, **trial)
    entered = 376.0 * min(1.0, total / 3.0)
    recruitment = Recruitment(min(3.0, total), total, dropout)
    assert expected_events(entered, recruitment, **trial) == pytest.approx(events, rel=1e-9)


def test_events_that_never_come_are_refused_in_a_sentence() -> None:
    with pytest.raises(
        DesignInvalid, match=r"Found 100 events of 100 subjects\. Accepted: fewer than 100\.0"
    ):
        duration_for_events(100.0, 100.0, accrual=1.0, control_hazard=0.1, hazard_ratio=0.7)


def test_looks_inflate_the_subjects() -> None:
    recruitment = Recruitment(3.0, 5.0)
    trial = {"control_hazard": 0.3, "hazard_ratio": 2 / 3, **LEVELS}
    plain = lachin_foulkes_subjects(recruitment, **trial)
    assert lachin_foulkes_subjects(recruitment, inflation=1.06, **trial) == pytest.approx(1.06 * plain)


def test_time_that_runs_backwards_is_a_bug_in_the_caller() -> None:
    with pytest.raises(ValueError, match="recruitment needs"):
        Recruitment(3.0, 2.0)
