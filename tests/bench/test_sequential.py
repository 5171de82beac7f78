"""How long the group-sequential core takes on one thread: the best of several runs beside what is wanted.

The times wanted are those of an independent Gauss-Legendre recursion, right to 1e-15, on a like machine.
"""

from __future__ import annotations

import time
from collections.abc import Callable

import pytest

from app.model.plan import Design, Efficacy, Futility
from app.sequential.boundary import bounds_ahead
from app.sequential.density import Region
from app.sequential.effect import efficacy_rule, noncentrality_for_power
from app.sequential.stopping import Ended
from tests.sequential_plans import looks_at, rule_named

pytestmark = pytest.mark.bench

RUNS = 15


def milliseconds(work: Callable[[], object]) -> float:
    """The shortest of several runs."""
    work()
    taken = []
    for _ in range(RUNS):
        began = time.perf_counter()
        work()
        taken.append(time.perf_counter() - began)
    return 1000.0 * min(taken)


def shown(what: str, found: float, wanted: float) -> None:
    print(f"\n{what:<58}{found:8.2f} ms   wanted {wanted:g} ms")
    assert found <= wanted


@pytest.mark.parametrize(("looks", "wanted"), [(5, 2.0), (20, 10.0), (100, 120.0)])
@pytest.mark.parametrize("name", ["O'Brien-Fleming-type", "Pocock-type"])
def test_all_bounds_of_a_plan(name: str, looks: int, wanted: float) -> None:
    rule = rule_named(name, 0.025)
    ahead = looks_at([look / looks for look in range(1, looks + 1)])
    shown(f"{name}: all bounds of {looks} looks", milliseconds(lambda: bounds_ahead(rule, (), ahead)), wanted)


FIVE = Design(0.025, 1, 0.9, 0.75, 533, (0.2, 0.4, 0.6, 0.8, 1.0))
SPENT = Futility("Hwang-Shih-DeCani", parameter=-3.0)


@pytest.mark.parametrize("futility", [None, SPENT], ids=["efficacy only", "with futility"])
def test_the_noncentrality_for_a_power(futility: Futility | None) -> None:
    rule = efficacy_rule(FIVE, Efficacy("O'Brien-Fleming-type"), 1)
    search = noncentrality_for_power.__wrapped__  # past the memory of answers
    what = f"noncentrality for a power, 5 looks{', with futility' if futility else ''}"
    shown(what, milliseconds(lambda: search(rule, FIVE, 0.5, futility)), 10.0)


def test_inference_after_a_stop() -> None:
    regions = tuple(Region(-z, z) for z in (4.56, 3.23, 2.63, 2.28))
    ended = Ended((0.2, 0.4, 0.6, 0.8, 1.0), regions, 2.3)

    def infer() -> None:
        ended.probability_of_more(0.0)
        for probability in (0.025, 0.5, 0.975):
            ended.drift_with(probability)

    shown("p, median and interval after a stop at the fifth look", milliseconds(infer), 50.0)
