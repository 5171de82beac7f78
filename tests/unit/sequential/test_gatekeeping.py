"""Hypotheses that wait: when they are tested, in which order, at what level together, and with what error."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from app.model.boundary import Bound, LookAsUsed, Verdict
from app.model.plan import Design, Efficacy, Hypothesis
from app.model.values import Absent
from app.sequential.effect import planned_looks, rules_of
from app.sequential.gatekeeping import (
    family_alpha,
    gated_history,
    gated_verdict,
    in_testing_order,
    opened_at,
)

TRIALS = 200_000
DESIGN = Design(0.025, 1, 0.9, 0.75, 400, (0.5, 1.0))


def planned_bounds(spending: str) -> tuple[Bound, ...]:
    rules = rules_of(DESIGN, Efficacy(spending), experimental_share=0.5, direction=1)
    return rules.bounds((), planned_looks(DESIGN, DESIGN.looks, 0.5, final=False))


BOUNDS = planned_bounds("O'Brien-Fleming-type")
FIRST, LAST = BOUNDS


def held(bound: Bound, z: float | None, crossed: str = "none") -> LookAsUsed:
    information = float(bound.events)
    return LookAsUsed(
        bound.number, "planned", information, bound.events, bound.information_fraction, z,
        bound.efficacy_z, bound.alpha_spent, bound.final, crossed,
    )  # fmt: skip


def hypothesis(name: str, after: str | None = None, alpha: float = 0.025) -> Hypothesis:
    return Hypothesis(name, name.upper(), name, "bad", alpha, 300, Efficacy("Pocock-type"), after)


# --- when the gate opens --------------------------------------------------------------------------------


def test_only_a_crossing_of_efficacy_opens_the_gate_and_it_stays_open() -> None:
    none, here = Verdict("none", None), Verdict("efficacy", 2)
    assert opened_at([held(FIRST, 1.0)], none, 2) is None
    assert opened_at([held(FIRST, 1.0)], here, 2) == 2
    assert opened_at([held(FIRST, 4.0, "efficacy")], Verdict("none", 1), 2) == 1
    for other in ("futility", "harm", "control"):
        assert opened_at([held(FIRST, -4.0, other)], Verdict("none", 1), 2) is None


def test_while_it_waits_nothing_is_crossed_however_large_z() -> None:
    assert gated_verdict([], 9.0, FIRST, 1, None) == Verdict("none", None)
    assert gated_verdict([], 9.0, FIRST, 1, 1) == Verdict("efficacy", 1)


def test_a_z_beyond_its_bound_while_it_waited_has_not_crossed() -> None:
    """Tested with what it holds once the gate is open: 1.5 at the last look, not 9 at the first."""
    past = [held(FIRST, 9.0, "efficacy")]
    assert gated_verdict(past, 1.5, LAST, 1, 2) == Verdict("none", None)
    assert gated_history(past, 2, 1)[0].crossed == "none"
    assert gated_history(past, 1, 1)[0].crossed == "efficacy"


def test_a_final_look_that_came_while_it_waited_decides_once_the_gate_is_open() -> None:
    """No later look has a bound of its own, so else it could never be rejected."""
    over_running = replace(LAST, number=3, efficacy_z=Absent("all alpha is already spent"))
    past = [held(FIRST, 9.0), held(LAST, 2.5)]
    assert gated_verdict(past, 9.0, over_running, 1, None) == Verdict("none", None)
    assert gated_verdict(past, 9.0, over_running, 1, 3) == Verdict("none", 2)
    assert gated_verdict([held(FIRST, 9.0), held(LAST, 1.5)], 9.0, over_running, 1, 3) == Verdict(
        "none", None
    )


def test_what_waits_for_one_that_waited_opens_no_sooner_than_that() -> None:
    past = gated_history([held(FIRST, 1.0), held(LAST, 2.5)], 3, 1)
    assert opened_at(past, Verdict("none", 2), 3, gate=3) == 3
    assert opened_at(past, Verdict("none", 2), 4, gate=3) == 3
    assert opened_at([], Verdict("none", None), 3, gate=3) is None


def test_once_crossed_there_is_no_second_test() -> None:
    assert gated_verdict([held(FIRST, 9.0)], 9.0, LAST, 1, 1) == Verdict("none", 1)


def test_no_z_and_no_bound_cross_nothing() -> None:
    assert gated_verdict([], None, FIRST, 1, 1) == Verdict("none", None)
    unbound = replace(FIRST, efficacy_z=Absent("nothing to spend"))
    assert gated_verdict([], 9.0, unbound, 1, 1) == Verdict("none", None)


# --- order and level ------------------------------------------------------------------------------------


def test_each_comes_after_the_one_it_waits_for() -> None:
    given = [hypothesis("c", "b"), hypothesis("d"), hypothesis("b", "a"), hypothesis("a", "primary")]
    order = [each.name for each in in_testing_order(given)]
    assert sorted(order) == ["a", "b", "c", "d"]
    assert order.index("a") < order.index("b") < order.index("c")


@pytest.mark.parametrize(
    ("hypotheses", "level"),
    [
        ([], 0.02),
        ([hypothesis("a", alpha=0.005)], 0.025),  # split: Bonferroni
        ([hypothesis("a", "primary", 0.02)], 0.02),  # one after the other: no price
        ([hypothesis("a", "primary", 0.025)], 0.025),
        ([hypothesis("a", "primary", 0.015), hypothesis("b", "primary", 0.015)], 0.03),
        ([hypothesis("a", alpha=0.005), hypothesis("b", "a", 0.01)], 0.03),
    ],
)
def test_alphas_add_up_side_by_side_and_the_largest_counts_along_a_chain(
    hypotheses: list[Hypothesis], level: float
) -> None:
    assert family_alpha(0.02, hypotheses) == pytest.approx(level, abs=1e-15)


def test_a_chain_as_long_as_a_plan_file_may_hold_has_a_level() -> None:
    chain = [hypothesis(f"h{at}", f"h{at - 1}" if at else "primary", 0.01) for at in range(1500)]
    assert family_alpha(0.02, chain) == 0.02
    assert family_alpha(0.005, chain) == 0.01


# --- the error of waiting -------------------------------------------------------------------------------


def correlated_z(drift: float, correlation: float) -> tuple[np.ndarray, np.ndarray]:
    """z of both hypotheses at both looks, shape (trials, 2); only the first has an effect."""
    random = np.random.default_rng(20_261_201)
    steps = random.standard_normal((2, TRIALS, 2))
    steps[1] = correlation * steps[0] + np.sqrt(1.0 - correlation**2) * steps[1]
    times = np.array([0.5, 1.0])
    scores = np.cumsum(steps * np.sqrt(np.diff(times, prepend=0.0)), axis=2)
    primary, waiting = scores / np.sqrt(times)
    return primary + drift * np.sqrt(times), waiting


def literal_rejections(primary: np.ndarray, waiting: np.ndarray, bounds: tuple[float, float]) -> np.ndarray:
    """The second hypothesis at each look from the one at which the first has crossed."""
    opens = primary[:, 0] >= FIRST.efficacy_z
    late = ~opens & (primary[:, 1] >= LAST.efficacy_z)
    return (opens & (waiting[:, 0] >= bounds[0])) | ((opens | late) & (waiting[:, 1] >= bounds[1]))


@pytest.mark.parametrize("drift", [1.5, 3.0, 4.5])
@pytest.mark.parametrize("spending", ["O'Brien-Fleming-type", "Pocock-type"])
def test_a_hypothesis_that_waits_keeps_its_level_whatever_the_first_one_does(
    drift: float, spending: str
) -> None:
    first, last = planned_bounds(spending)
    primary, waiting = correlated_z(drift, 0.9)
    rate = literal_rejections(primary, waiting, (first.efficacy_z, last.efficacy_z)).mean()
    assert rate <= 0.025 + 3.0 * np.sqrt(0.025 * 0.975 / TRIALS)


def test_testing_it_at_its_nominal_level_when_the_gate_opens_does_not() -> None:
    """The fault that Hung, Wang & O'Neill (2007) describe: 1.96 at whichever look opens the gate."""
    primary, waiting = correlated_z(3.0, 0.9)
    opens = primary[:, 0] >= FIRST.efficacy_z
    late = ~opens & (primary[:, 1] >= LAST.efficacy_z)
    naive = (opens & (waiting[:, 0] >= 1.96)) | (late & (waiting[:, 1] >= 1.96))
    assert naive.mean() > 0.025 + 10.0 * np.sqrt(0.025 * 0.975 / TRIALS)


def test_the_verdicts_are_those_of_the_literal_rule() -> None:
    primary, waiting = correlated_z(3.0, 0.9)
    literal = literal_rejections(primary, waiting, (FIRST.efficacy_z, LAST.efficacy_z))
    for trial in range(2_000):
        (one, two), (z, later) = primary[trial], waiting[trial]
        open_first = opened_at([], Verdict("efficacy" if one >= FIRST.efficacy_z else "none", None), 1)
        before = gated_verdict([], z, FIRST, 1, open_first)
        past = [held(FIRST, one, "efficacy" if open_first else "none")]
        crosses = "efficacy" if two >= LAST.efficacy_z and not open_first else "none"
        stands = gated_verdict(
            [held(FIRST, z, before.crossed)], later, LAST, 1, opened_at(past, Verdict(crosses, None), 2)
        )
        assert (stands.first_crossed is not None) == literal[trial]
