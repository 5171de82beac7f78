"""Invented patients and trials: who they are, when looks fall, which end is counted."""

from __future__ import annotations

import math

import numpy as np
import pytest

from app.model.boundary import Bound
from app.model.values import Absent
from app.simulation.patients import Population, draw_patients
from app.simulation.trials import Rate, rates, simulated_z
from app.survival import logrank

POPULATION = Population(200, accrual=12.0, control_hazards=(0.05, 0.1), hazard_ratio=0.5, dropout_hazard=0.01)


def randomness() -> np.random.Generator:
    return np.random.default_rng(7)


def bound(number: int, efficacy_z: float | Absent, *, futility_z: float | None = None) -> Bound:
    final = number == 3
    return Bound(number, number / 3, number, final, 0.01, 0.01, efficacy_z, 0.01, 0.7, futility_z=futility_z)


def test_patients_enter_within_accrual_and_the_allocation_is_exact() -> None:
    patients = draw_patients(Population(90, 12.0, (0.05,), allocation=(1, 2)), 50, randomness())
    assert patients.entry.shape == (50, 90)
    assert 0.0 <= patients.entry.min() <= patients.entry.max() <= 12.0
    assert set(patients.experimental.sum(axis=1).tolist()) == {60}


def test_hazards_are_those_of_arm_and_stratum() -> None:
    """Means of exponential times, four standard errors wide, without drop-out."""
    population = Population(400, 1.0, (0.05, 0.2), hazard_ratio=0.5)
    patients = draw_patients(population, 200, randomness())
    for stratum, hazard in enumerate(population.control_hazards):
        for arm, ratio in ((False, 1.0), (True, 0.5)):
            chosen = (patients.stratum == stratum) & (patients.experimental == arm)
            times = patients.event[chosen]
            assert times.mean() * hazard * ratio == pytest.approx(1.0, abs=4.0 / math.sqrt(times.size))


def test_who_drops_out_first_has_no_event() -> None:
    patients = draw_patients(POPULATION, 20, randomness())
    assert (np.isinf(patients.event) | (patients.event <= patients.leaves)).all()
    assert 0.05 < np.isinf(patients.event).mean() < 0.3


@pytest.mark.parametrize("stratified", [False, True])
def test_a_look_is_the_log_rank_test_when_the_event_of_its_count_has_happened(stratified: bool) -> None:
    z = simulated_z(POPULATION, [30, 80], 3, randomness(), stratified=stratified)
    patients = draw_patients(POPULATION, 3, randomness())
    for trial in range(3):
        calendar = patients.event_calendar[trial]
        for look, events in enumerate((30, 80)):
            cutoff = np.sort(calendar)[events - 1]
            entered = patients.entry[trial] < cutoff
            seen = calendar[entered] <= cutoff
            assert seen.sum() == events
            followed = np.minimum(patients.leaves[trial], cutoff - patients.entry[trial])[entered]
            result = logrank(
                np.where(seen, patients.event[trial][entered], followed),
                seen,
                patients.experimental[trial][entered],
                stratum=patients.stratum[trial][entered] if stratified else None,
            )
            assert z[trial, look] == result.z


def test_the_same_randomness_gives_the_same_trials() -> None:
    once, again = (simulated_z(POPULATION, [40], 5, randomness()) for _ in range(2))
    assert once.tolist() == again.tolist()


def test_more_events_than_patients_have_are_refused() -> None:
    with pytest.raises(ValueError, match="not every trial of 200 patients reaches 200 events"):
        simulated_z(POPULATION, [100, 200], 5, randomness())


@pytest.mark.parametrize(
    "change",
    [{"subjects": 1}, {"control_hazards": (0.0,)}, {"control_hazards": ()}, {"dropout_hazard": -0.1}],
)
def test_an_impossible_population_is_a_bug_in_the_caller(change: dict[str, object]) -> None:
    with pytest.raises(ValueError):
        Population(**{"subjects": 10, "accrual": 1.0, "control_hazards": (0.1,), **change})  # type: ignore[arg-type]


BOUNDS = (
    bound(1, Absent("too early"), futility_z=0.0),
    bound(2, 2.5, futility_z=1.0),
    bound(3, 2.0, futility_z=2.0),
)
PATHS = np.array(
    [
        [-0.1, 3.0, 3.0],  # futility at the first look, then much better
        [3.0, 2.4, 2.1],  # efficacy at the last look only, the first having no bound
        [0.5, 2.5, 0.0],  # efficacy at the second, met exactly
        [0.5, 0.9, 2.5],  # futility at the second
        [0.5, 1.5, 1.9],  # nothing
        [0.5, -2.6, -3.0],  # the other side
    ]
)


def test_a_trial_ends_at_the_first_bound_it_meets() -> None:
    found = rates(PATHS, BOUNDS)
    assert (found.efficacy.count, found.futility.count, found.control.count) == (2, 3, 0)


def test_futility_can_be_ignored() -> None:
    found = rates(PATHS, BOUNDS, obey_futility=False)
    assert (found.efficacy.count, found.futility.count) == (4, 0)


def test_two_sides_end_on_both() -> None:
    found = rates(PATHS, BOUNDS, 2, obey_futility=False)
    assert (found.efficacy.count, found.control.count) == (4, 1)


def test_a_rate_knows_its_monte_carlo_error() -> None:
    rate = Rate(30, 1000)
    assert rate.value == 0.03
    assert rate.std_error(0.025) == pytest.approx(math.sqrt(0.025 * 0.975 / 1000), rel=1e-14)
    assert rate.distance(0.025) == pytest.approx(0.005 / rate.std_error(0.025), rel=1e-12)
