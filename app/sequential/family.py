"""Boundaries of a fixed shape: Pocock, O'Brien-Fleming, Wang-Tsiatis, Haybittle-Peto."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from scipy.optimize import brentq
from scipy.special import ndtri

from app.model.plan import Efficacy, Sides
from app.sequential.density import Region, crossing_probabilities

FAMILY_NAMES = ("O'Brien-Fleming", "Pocock", "Wang-Tsiatis", "Haybittle-Peto")

_SHAPES = {"O'Brien-Fleming": 0.0, "Pocock": 0.5}


@dataclass(frozen=True)
class FixedFamily:
    """Interim bounds constant * t^(shape - 1/2), `alpha` of one side; the final bound is solved for.

    Notes
    -----
    *Convention*: `constant` makes the bounds at the plan's looks cross with probability alpha in all; it
    stands at looks that fall elsewhere, and the final bound then takes up what is left of alpha.
    Haybittle-Peto has the same bound at every interim look (shape 1/2) and leaves the constant to the plan.
    *Checked*: against print (tests/published/test_sequential.py).

    References
    ----------
    Pocock (1977), Biometrika 64, 191-199; O'Brien & Fleming (1979), Biometrics 35, 549-556; Wang & Tsiatis
    (1987), Biometrics 43, 193-199; Haybittle (1971), British Journal of Radiology 44, 793-797; Jennison &
    Turnbull (2000), chapter 2.
    """

    name: str
    alpha: float
    constant: float
    shape: float

    def interim_bound(self, fraction: float) -> float:
        """The bound in z at an interim look at this information fraction."""
        return self.constant * math.pow(fraction, self.shape - 0.5)


def fixed_family(
    efficacy: Efficacy, alpha_one_side: float, sides: Sides, looks: Sequence[float]
) -> FixedFamily:
    """The family that a plan names, with the constant of the plan's own looks.

    Parameters
    ----------
    efficacy : the plan's rule; `spending` is one of `FAMILY_NAMES`, with the key that it needs
    alpha_one_side : float in (0, 0.5)
    sides : 1, or 2 for the symmetric region (-c, c)
    looks : the plan's information fractions, positive, increasing

    Raises
    ------
    ValueError : an unknown name or a key missing - the plan reader lets neither through.
    """
    if efficacy.spending == "Haybittle-Peto" and efficacy.interim_z is not None:
        return FixedFamily(efficacy.spending, alpha_one_side, efficacy.interim_z, 0.5)
    shape = _SHAPES.get(efficacy.spending, efficacy.shape)
    if efficacy.spending not in FAMILY_NAMES or shape is None:
        raise ValueError(f"spending must be one of {FAMILY_NAMES} with the key it needs, got {efficacy!r}")
    constant = planned_constant(shape, alpha_one_side, sides, looks)
    return FixedFamily(efficacy.spending, alpha_one_side, constant, shape)


def planned_constant(shape: float, alpha_one_side: float, sides: Sides, looks: Sequence[float]) -> float:
    """The c for which bounds c t^(shape - 1/2) at these looks are first crossed upwards with alpha in all.

    Notes
    -----
    The root lies between the constant that makes the highest bound z(1 - alpha), where that look alone
    crosses with alpha, and the one that makes the lowest z(1 - alpha / K), where all of them together cannot.
    *Stopping rule*: 1e-13 in the constant.
    """
    factors = [math.pow(fraction, shape - 0.5) for fraction in looks]

    def excess(constant: float) -> float:
        regions = [
            Region(-constant * factor if sides == 2 else -math.inf, constant * factor) for factor in factors
        ]
        return float(crossing_probabilities(looks, regions).upper.sum()) - alpha_one_side

    low = -float(ndtri(alpha_one_side)) / max(factors)
    high = -float(ndtri(alpha_one_side / len(looks))) / min(factors)
    return float(brentq(excess, min(low, high) * 0.999, max(low, high) * 1.001, xtol=1e-13, rtol=1e-14))
