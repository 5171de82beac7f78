"""How much error may be spent by a time (Lan & DeMets 1983): alpha of one side, or the type II error."""

from __future__ import annotations

import math
import sys
from bisect import bisect_right
from collections.abc import Callable
from dataclasses import dataclass
from functools import partial

from scipy.special import ndtr, ndtri

from app.model.plan import Efficacy, Futility, Harm

SMALLEST_SPEND = sys.float_info.min  # below it a double loses digits, and then the number itself

_Formula = Callable[[float, float], float]
_Points = tuple[tuple[float, float], ...]

_PRACTICALLY_LINEAR = 1e-13  # below it the exponential of Hwang, Shih & DeCani is 1 plus its argument


def _obrien_fleming_type(fraction: float, alpha: float) -> float:
    """2 - 2 Phi(z(1 - alpha/2) / sqrt t), written as a lower tail so that small spends keep their digits."""
    return 2.0 * float(ndtr(ndtri(alpha / 2.0) / math.sqrt(fraction)))


def _pocock_type(fraction: float, alpha: float) -> float:
    """alpha log(1 + (e - 1) t)."""
    return alpha * math.log1p(math.expm1(1.0) * fraction)


def _power(exponent: float, fraction: float, alpha: float) -> float:
    """alpha t^exponent (Kim & DeMets 1987)."""
    return float(alpha * fraction**exponent)


def _hwang_shih_decani(parameter: float, fraction: float, alpha: float) -> float:
    """alpha (1 - exp(-g t)) / (1 - exp(-g)); for g < 0 both sides are turned, so that nothing overflows."""
    if abs(parameter) < _PRACTICALLY_LINEAR:
        return alpha * fraction
    if parameter > 0.0:
        return alpha * math.expm1(-parameter * fraction) / math.expm1(-parameter)
    late = math.exp(parameter * (1.0 - fraction))
    return alpha * late * math.expm1(parameter * fraction) / math.expm1(parameter)


def _table(points: _Points, fraction: float, _: float) -> float:
    """Straight lines between the points, from nothing at 0."""
    known = ((0.0, 0.0), *points)
    after = bisect_right(known, fraction, key=lambda point: point[0])
    (start, spent), (end, more) = known[after - 1], known[after]
    return spent + (more - spent) * (fraction - start) / (end - start)


SPENDING_NAMES = ("O'Brien-Fleming-type", "Pocock-type", "power", "Hwang-Shih-DeCani", "table")


@dataclass(frozen=True)
class SpendingFunction:
    """Cumulative error by time: 0 at 0, `alpha` from 1 on.

    Notes
    -----
    *Convention*: `alpha` is the level of the side that spends it; a two-sided test spends alpha/2 on each
    side through the function at alpha/2 (see DEVELOPERS.md, Methods: spending). For futility it is the type
    II error, 1 - power.
    *Accuracy*: relative error below 1e-14, or 1e-12 where the spend is below 1e-100; a spend below
    the smallest normal double is 0.
    *Checked*: against print (tests/published/test_sequential.py) and at 50 digits (tests/precise/).

    References
    ----------
    Lan & DeMets (1983), Biometrika 70, 659-663; Kim & DeMets (1987), Biometrika 74, 149-154; Hwang, Shih &
    DeCani (1990), Statistics in Medicine 9, 1439-1445.
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
    efficacy : the plan's rule; `spending` is one of `SPENDING_NAMES`, with the key that it needs
    alpha_one_side : float in (0, 0.5)

    Raises
    ------
    ValueError : an unknown name, a key missing or an alpha outside its domain - the plan reader lets none
    through.
    """
    if not 0.0 < alpha_one_side < 0.5:
        raise ValueError(f"alpha_one_side must lie in (0, 0.5), got {alpha_one_side!r}")
    return SpendingFunction(efficacy.spending, alpha_one_side, _formula(efficacy))


def type_two_spending(futility: Futility, power: float) -> SpendingFunction:
    """The function by which a futility boundary spends 1 - power; domains as in `spending_function`."""
    if futility.spending is None or not 0.0 < power < 1.0:
        raise ValueError(f"futility needs spending and a power in (0, 1), got {futility!r} and {power!r}")
    named = Efficacy(
        futility.spending,
        exponent=futility.exponent,
        parameter=futility.parameter,
        points=futility.points,
    )
    return SpendingFunction(named.spending, 1.0 - power, _formula(named))


def harm_spending(harm: Harm) -> SpendingFunction:
    """The function by which a harm boundary spends its own one-sided alpha."""
    return spending_function(Efficacy(harm.spending), harm.alpha)


def _formula(efficacy: Efficacy) -> _Formula:
    match efficacy:
        case Efficacy(spending="O'Brien-Fleming-type"):
            return _obrien_fleming_type
        case Efficacy(spending="Pocock-type"):
            return _pocock_type
        case Efficacy(spending="power", exponent=exponent) if exponent is not None and exponent > 0.0:
            return partial(_power, exponent)
        case Efficacy(spending="Hwang-Shih-DeCani", parameter=parameter) if parameter is not None:
            return partial(_hwang_shih_decani, parameter)
        case Efficacy(spending="table", points=points) if points:
            return partial(_table, points)
    raise ValueError(f"spending must be one of {SPENDING_NAMES} with the key it needs, got {efficacy!r}")
