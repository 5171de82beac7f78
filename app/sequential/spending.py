"""How much alpha may be spent by an information fraction (Lan & DeMets 1983). Alphas are of one side."""

from __future__ import annotations

import math
import sys
from collections.abc import Callable
from dataclasses import dataclass
from types import MappingProxyType

from scipy.special import ndtr, ndtri

from app.model.plan import Efficacy

SMALLEST_SPEND = sys.float_info.min  # below it a double loses digits, and then the number itself

_Formula = Callable[[float, float], float]


def _obrien_fleming_type(fraction: float, alpha: float) -> float:
    """2 - 2 Phi(z(1 - alpha/2) / sqrt t), written as a lower tail so that small spends keep their digits."""
    return 2.0 * float(ndtr(ndtri(alpha / 2.0) / math.sqrt(fraction)))


def _pocock_type(fraction: float, alpha: float) -> float:
    """alpha log(1 + (e - 1) t)."""
    return alpha * math.log1p(math.expm1(1.0) * fraction)


_FORMULAS = MappingProxyType(
    {
        "O'Brien-Fleming-type": _obrien_fleming_type,
        "Pocock-type": _pocock_type,
    }
)
SPENDING_NAMES = tuple(_FORMULAS)


@dataclass(frozen=True)
class SpendingFunction:
    """Cumulative alpha of one side by information fraction: 0 at 0, `alpha` from 1 on.

    Notes
    -----
    *Convention*: `alpha` is the level of the side that spends it; a two-sided test spends alpha/2 on each
    side through the function at alpha/2 (see DEVELOPERS.md, Methods: spending).
    *Accuracy*: relative error below 1e-14, or 1e-12 where the spend is below 1e-100; a spend below
    the smallest normal double is 0.
    *Checked*: against print (tests/published/test_sequential.py) and at 50 digits (tests/precise/).

    References
    ----------
    Lan & DeMets (1983), Biometrika 70, 659-663; Kim & DeMets (1987), Biometrika 74, 149-154.
    """

    name: str
    alpha: float
    formula: _Formula

    def __call__(self, fraction: float) -> float:
        if fraction <= 0.0:
            return 0.0
        if fraction >= 1.0:
            return self.alpha
        spent = self.formula(fraction, self.alpha)
        return min(spent, self.alpha) if spent >= SMALLEST_SPEND else 0.0


def spending_function(efficacy: Efficacy, alpha_one_side: float) -> SpendingFunction:
    """The spending function that a plan names, at the level of one side.

    Parameters
    ----------
    efficacy : the plan's rule; `spending` is one of `SPENDING_NAMES`
    alpha_one_side : float in (0, 0.5)

    Raises
    ------
    ValueError : an unknown name or an alpha outside its domain - the plan reader lets neither through.
    """
    if efficacy.spending not in _FORMULAS:
        raise ValueError(f"spending must be one of {SPENDING_NAMES}, got {efficacy.spending!r}")
    if not 0.0 < alpha_one_side < 0.5:
        raise ValueError(f"alpha_one_side must lie in (0, 0.5), got {alpha_one_side!r}")
    return SpendingFunction(efficacy.spending, alpha_one_side, _FORMULAS[efficacy.spending])
