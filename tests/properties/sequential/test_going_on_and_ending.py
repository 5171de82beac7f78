"""What must hold for conditional power and for inference after a stop, whatever the numbers."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.special import ndtr

from app.model.boundary import Bound, LookAsUsed
from app.model.plan import Sides
from app.model.values import Absent
from app.sequential.boundary import EfficacyRule, bounds_ahead
from app.sequential.density import Region, crossing_probabilities
from app.sequential.outlook import conditional_power_at, predictive_power_at
from app.sequential.spending import SPENDING_NAMES
from app.sequential.stopping import Ended, stopping
from tests.sequential_plans import looks_at, rule_named

names = st.sampled_from(SPENDING_NAMES)
alphas = st.floats(1e-3, 0.1)
sides_of = st.sampled_from((1, 2))
percents = st.lists(st.integers(10, 95), min_size=1, max_size=4, unique=True).map(sorted)


def fractions_of(percents: Sequence[int]) -> list[float]:
    return [*(percent / 100 for percent in percents), 1.0]


def held(bounds: Sequence[Bound]) -> list[LookAsUsed]:
    """Each bound as the bound of a look held."""
    return [
        LookAsUsed(
            bound.number, "planned", bound.information_fraction, bound.events, bound.information_fraction,
            0.0, bound.efficacy_z, bound.alpha_spent, bound.final,
        )
        for bound in bounds
    ]  # fmt: skip


@given(names, alphas, sides_of, percents)
def test_p_at_a_bound_is_the_alpha_spent_by_it(
    name: str, alpha: float, sides: Sides, percents: list[int]
) -> None:
    rule = rule_named(name, alpha, sides)
    bounds = bounds_ahead(rule, (), looks_at(fractions_of(percents)))
    for at, bound in enumerate(bounds):
        assert isinstance(bound.efficacy_z, float)
        found = stopping(held(bounds[:at]), bound.efficacy_z, bound.information_fraction, rule, 1.0)
        assert found.p_one_sided == pytest.approx(bound.alpha_spent, rel=1e-11)


@given(names, alphas, sides_of, percents, st.floats(-2.0, 4.0))
def test_the_interval_leaves_out_one_exactly_when_p_is_at_most_alpha(
    name: str, alpha: float, sides: Sides, percents: list[int], z: float
) -> None:
    rule = rule_named(name, alpha, sides)
    bounds = bounds_ahead(rule, (), looks_at(fractions_of(percents)))
    found = stopping(held(bounds[:-1]), z, 1.0, rule, 25.0)
    assert found.ci_low < found.median_unbiased_hazard_ratio < found.ci_high  # type: ignore[operator]
    assert (found.ci_high < 1.0) == (found.p_one_sided < alpha)  # type: ignore[operator]


@given(names, alphas, percents, st.floats(-1.0, 4.0))
def test_power_is_conditional_power_averaged_over_the_first_look(
    name: str, alpha: float, percents: list[int], effect: float
) -> None:
    """Crossing at the first look, plus what follows it integrated over z there (Gauss-Legendre, 80 nodes)."""
    rule, fractions = rule_named(name, alpha), fractions_of(percents)
    regions = _regions(rule, bounds_ahead(rule, (), looks_at(fractions)))
    whole = crossing_probabilities(fractions, regions, drift=effect).upper
    mean, first = effect * math.sqrt(fractions[0]), regions[0].upper
    low, high = mean - 9.0, min(first, mean + 9.0)
    node, weight = np.polynomial.legendre.leggauss(80)
    z = low + (high - low) * (node + 1.0) / 2.0
    density = np.exp(-((z - mean) ** 2) / 2.0) / math.sqrt(2.0 * math.pi) * weight * (high - low) / 2.0
    later = [
        crossing_probabilities(fractions[1:], regions[1:], drift=effect, after=(fractions[0], at)).upper.sum()
        for at in z.tolist()
    ]
    assert whole[0] + float(density @ np.array(later)) == pytest.approx(whole.sum(), abs=1e-9)


def _regions(rule: EfficacyRule, bounds: Sequence[Bound]) -> list[Region]:
    return [rule.region(bound.efficacy_z) for bound in bounds]


@given(st.floats(-2.0, 4.0), st.floats(0.05, 0.95), st.floats(1.5, 3.0), st.floats(-1.0, 5.0))
def test_conditional_power_grows_with_z_and_with_the_effect(
    z: float, fraction: float, criterion: float, effect: float
) -> None:
    here = conditional_power_at(z, fraction, criterion, 1.0, effect)
    assert here <= conditional_power_at(z + 0.1, fraction, criterion, 1.0, effect)
    assert here <= conditional_power_at(z, fraction, criterion, 1.0, effect + 0.1)


@given(st.floats(-2.0, 4.0), st.floats(0.05, 0.95), st.floats(1.5, 3.0))
def test_flat_predictive_power_is_nearer_to_one_half_than_power_under_the_trend(
    z: float, fraction: float, criterion: float
) -> None:
    """Not knowing the effect makes every verdict less sure."""
    trend = conditional_power_at(z, fraction, criterion, 1.0, z / math.sqrt(fraction))
    predictive = predictive_power_at(z, fraction, criterion, 1.0)
    assert abs(predictive - 0.5) <= abs(trend - 0.5) + 1e-12


@pytest.mark.parametrize("effect", [0.0, 2.0, 3.5])
@pytest.mark.parametrize(
    ("z", "fractions"), [((2.4, 2.4, 2.4), (0.3, 0.6, 1.0)), ((3.7, 2.5, 2.0), (1 / 3, 2 / 3, 1.0))]
)
def test_the_median_is_unbiased_and_the_interval_covers(
    z: tuple[float, ...], fractions: tuple[float, ...], effect: float
) -> None:
    """20,000 trials: the estimate lies above the effect as often as below it, the 95% limits cover it.

    An estimate lies above the effect exactly when the probability of more, under the effect, is below one
    half, so each trial costs one recursion. Four Monte Carlo standard errors.
    """
    trials, randomness = 20_000, np.random.default_rng(5)
    steps = np.diff((0.0, *fractions))
    score = np.cumsum(randomness.normal(effect * steps, np.sqrt(steps), (trials, 3)), axis=1)
    paths = score / np.sqrt(fractions)
    stage = np.argmax(np.column_stack([paths[:, :2] >= np.array(z)[:2], np.ones(trials, dtype=bool)]), axis=1)
    below = np.concatenate(
        [_probability_of_more(fractions, z, at, effect, paths[stage == at, at]) for at in range(3)]
    )
    for probability in (0.025, 0.5, 0.975):
        expected_error = math.sqrt(probability * (1.0 - probability) / trials)
        assert (below < probability).mean() == pytest.approx(probability, abs=4.0 * expected_error)


def _probability_of_more(
    fractions: Sequence[float], bounds: Sequence[float], at: int, effect: float, z: np.ndarray
) -> np.ndarray:
    """For every z at one look; interpolated in a table, as the probability is smooth in z."""
    grid = np.linspace(z.min(), z.max(), 200)
    regions = tuple(Region(upper=bound) for bound in bounds[:at])
    known = [Ended(tuple(fractions[: at + 1]), regions, value).probability_of_more(effect) for value in grid]
    return np.interp(z, grid, known)


@given(alphas, percents, st.floats(-1.0, 3.0))
def test_a_look_without_a_bound_changes_no_inference(alpha: float, percents: list[int], z: float) -> None:
    rule = rule_named("Pocock-type", alpha)
    bounds = held(bounds_ahead(rule, (), looks_at(fractions_of(percents))))[:-1]
    safety = LookAsUsed(
        0, "safety", 0.05, 1, 0.05, 0.0, Absent("a safety look has no efficacy bound"), 0.0, False
    )
    assert stopping([safety, *bounds], z, 1.0, rule, 25.0) == stopping(bounds, z, 1.0, rule, 25.0)


def test_one_look_gives_the_naive_answers() -> None:
    found = stopping([], 2.0, 1.0, rule_named("Pocock-type", 0.025), 25.0)
    assert found.p_one_sided == pytest.approx(float(ndtr(-2.0)), rel=1e-14)
    assert found.median_unbiased_hazard_ratio == pytest.approx(math.exp(-2.0 / 5.0), rel=1e-11)
