"""Plans for the tests of the group-sequential core."""

from __future__ import annotations

import pytest

from app.model.plan import Efficacy, Sides
from app.sequential.boundary import EfficacyRule, LookAhead
from app.sequential.spending import SPENDING_NAMES, spending_function

SPENDINGS = SPENDING_NAMES


def efficacy_named(name: str, alpha_one_side: float) -> Efficacy:
    """The spending function of this name, with a key of ours where it needs one."""
    return Efficacy(
        name,
        exponent=2.5 if name == "power" else None,
        parameter=-4.0 if name == "Hwang-Shih-DeCani" else None,
        points=_points(alpha_one_side) if name == "table" else (),
    )


def _points(alpha: float) -> tuple[tuple[float, float], ...]:
    """A table that spends a tenth by 0.3, a third by 0.65 and the rest by 1."""
    return ((0.3, 0.1 * alpha), (0.65, alpha / 3.0), (1.0, alpha))


def rule_named(name: str, alpha_one_side: float, sides: Sides = 1) -> EfficacyRule:
    """An efficacy rule by the spending function of this name."""
    return EfficacyRule(spending_function(efficacy_named(name, alpha_one_side), alpha_one_side), sides, 1)


def looks_at(fractions: list[float] | tuple[float, ...], scale: float = 1.0) -> tuple[LookAhead, ...]:
    """Planned looks at these fractions, with information `scale` at fraction 1."""
    return tuple(LookAhead(at, "planned", t * scale, t, at, 1.0) for at, t in enumerate(fractions, start=1))


def quick_then_slow(quick: int, slow: int) -> list[object]:
    """Seeds, the later ones marked slow."""
    return [*range(quick), *(pytest.param(seed, marks=pytest.mark.slow) for seed in range(quick, slow))]
