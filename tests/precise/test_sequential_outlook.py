"""Conditional power and inference after a stop, over random plans and by other routes."""

from __future__ import annotations

import math
from dataclasses import dataclass

import mpmath
import numpy as np
import pytest

from app.sequential.density import Region, crossing_probabilities
from app.sequential.outlook import conditional_power_at, predictive_power_at
from app.sequential.stopping import Ended
from tests.precise.sequential_routes import backward_induction, multivariate_normal, nested_integrals
from tests.sequential_plans import quick_then_slow

REACHED = 1e-12


@dataclass(frozen=True)
class Onwards:
    """A look held at some information with some z, and looks with bounds after it."""

    held: tuple[float, float]
    information: tuple[float, ...]
    bounds: tuple[tuple[float, float], ...]
    drift: float

    @classmethod
    def random(cls, looks: int, seed: int) -> Onwards:
        draw = np.random.default_rng([looks, seed])
        times = np.cumsum(draw.uniform(0.05, 1.0, looks + 1)).tolist()
        lower = draw.uniform(-3.0, 0.5, looks) if seed % 2 else np.full(looks, -math.inf)
        upper = draw.uniform(1.0, 4.0, looks)
        return cls(
            (times[0], float(draw.uniform(-2.0, 3.0))),
            tuple(times[1:]),
            tuple(zip(lower.tolist(), upper.tolist(), strict=True)),
            float(draw.uniform(-2.0, 3.0)),
        )

    @property
    def restarted(self) -> tuple[list[float], list[tuple[float, float]]]:
        """The same problem begun anew at the look held: information and bounds of the score since then."""
        began, z = self.held
        score = z * math.sqrt(began)
        since = [at - began for at in self.information]

        def moved(bound: float, at: float) -> float:
            return (bound * math.sqrt(at) - score) / math.sqrt(at - began)

        bounds = [
            (moved(low, at), moved(high, at))
            for (low, high), at in zip(self.bounds, self.information, strict=True)
        ]
        return since, bounds

    @property
    def at_the_last_look(self) -> tuple[float, float]:
        crossings = crossing_probabilities(
            self.information, [Region(*bound) for bound in self.bounds], drift=self.drift, after=self.held
        )
        return float(crossings.upper[-1]), float(crossings.lower[-1])


@pytest.mark.parametrize("looks", [1, 2])
@pytest.mark.parametrize("seed", quick_then_slow(3, 10))
def test_what_follows_a_look_agrees_with_nested_integrals(looks: int, seed: int) -> None:
    plan = Onwards.random(looks, seed)
    assert plan.at_the_last_look == pytest.approx(nested_integrals(*plan.restarted, plan.drift), abs=REACHED)


@pytest.mark.parametrize("looks", [2, 3, 4, 8])
@pytest.mark.parametrize("seed", quick_then_slow(3, 25))
def test_what_follows_a_look_agrees_with_backward_induction(looks: int, seed: int) -> None:
    """Bounds far from the restarted path are brought near, as the route sees fourteen deviations."""
    plan = Onwards.random(looks, seed)
    since, bounds = plan.restarted
    near = [(max(low, -13.0), min(max(high, -12.0), 13.0)) for low, high in bounds]
    expected = backward_induction(since, near, plan.drift, 800)
    assert plan.at_the_last_look == pytest.approx(expected, abs=1e-10)


@pytest.mark.parametrize("seed", quick_then_slow(2, 6))
def test_what_follows_a_look_agrees_with_the_multivariate_normal(seed: int) -> None:
    plan = Onwards.random(3, 2 * seed + 1)
    since, bounds = plan.restarted
    assert plan.at_the_last_look == pytest.approx(
        multivariate_normal(since, bounds, plan.drift, seed), abs=5e-7
    )


@pytest.mark.parametrize("z", [-1.0, 0.5, 2.5])
@pytest.mark.parametrize("fraction", [0.1, 0.5, 0.95])
def test_conditional_power_at_the_last_look_is_the_recursion_with_one_look(z: float, fraction: float) -> None:
    last = Region(upper=2.1)
    for drift in (-1.0, 0.0, 3.2):
        recursion = crossing_probabilities([1.2], [last], drift=drift, after=(fraction, z)).upper[0]
        assert conditional_power_at(z, fraction, 2.1, 1.2, drift) == pytest.approx(recursion, rel=1e-13)


@pytest.mark.parametrize("prior", [None, (3.0, 1.5), (0.0, 0.2)])
@pytest.mark.parametrize(("z", "fraction"), [(1.5, 0.5), (-0.3, 0.2), (2.2, 0.9)])
def test_predictive_power_is_conditional_power_averaged_over_the_posterior(
    z: float, fraction: float, prior: tuple[float, float] | None
) -> None:
    """By adaptive quadrature at 20 digits over the posterior: prior times the likelihood of z."""
    with mpmath.workdps(20):

        def density(effect: mpmath.mpf) -> mpmath.mpf:
            believed = mpmath.mpf(1) if prior is None else mpmath.npdf(effect, *prior)
            return believed * mpmath.npdf(z - effect * mpmath.sqrt(fraction))

        def power(effect: mpmath.mpf) -> mpmath.mpf:
            mean = z * mpmath.sqrt(fraction) + effect * (1 - fraction)
            return mpmath.ncdf((mean - 1.96) / mpmath.sqrt(1 - fraction))

        steps = mpmath.linspace(-30, 40, 71)
        mass = mpmath.quad(density, steps)
        expected = float(mpmath.quad(lambda effect: density(effect) * power(effect), steps) / mass)
    assert predictive_power_at(z, fraction, 1.96, 1.0, prior) == pytest.approx(expected, abs=1e-12)


@pytest.mark.parametrize("looks", [2, 3, 5])
@pytest.mark.parametrize("seed", quick_then_slow(2, 20))
def test_the_probability_of_more_agrees_with_backward_induction(looks: int, seed: int) -> None:
    draw = np.random.default_rng([looks, seed])
    times = np.cumsum(draw.uniform(0.1, 1.0, looks)).tolist()
    upper = draw.uniform(1.5, 4.0, looks - 1).tolist()
    two_sided = bool(seed % 2)
    bounds = [(-c if two_sided else -math.inf, c) for c in upper]
    z, drift = float(draw.uniform(-1.0, 3.5)), float(draw.uniform(-1.0, 2.0))
    ended = Ended(tuple(times), tuple(Region(*bound) for bound in bounds), z)
    steps = [*bounds, (-math.inf, z)]
    expected = math.fsum(
        backward_induction(times[: at + 1], steps[: at + 1], drift, 600)[0] for at in range(looks)
    )
    assert ended.probability_of_more(drift) == pytest.approx(expected, abs=REACHED)


@pytest.mark.parametrize("probability", [0.025, 0.5, 0.975])
@pytest.mark.parametrize("seed", range(6))
def test_the_drift_found_has_the_probability_asked_for(probability: float, seed: int) -> None:
    draw = np.random.default_rng(seed)
    z = float(draw.uniform(-4.0, 6.0))
    ended = Ended((0.3, 0.6, 0.9), (Region(-3.0, 3.0), Region(0.1, 2.5)), z)
    assert ended.probability_of_more(ended.drift_with(probability)) == pytest.approx(probability, abs=1e-11)


@pytest.mark.parametrize("seed", range(5))
def test_doubling_the_grid_moves_nothing_that_follows_a_look(seed: int) -> None:
    plan = Onwards.random(5, seed)
    regions = [Region(*bound) for bound in plan.bounds]
    once, twice = (
        crossing_probabilities(
            plan.information, regions, drift=plan.drift, after=plan.held, refinement=refinement
        )
        for refinement in (1, 2)
    )
    assert once.upper.tolist() == pytest.approx(twice.upper.tolist(), abs=1e-13)
