"""What a result says when the trial ends at this look: p, median-unbiased ratio and interval.

By the stagewise ordering an end earlier at the efficacy bound says more than a later one, and at one look the
larger z says more. See DEVELOPERS.md, Methods: after a stop.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

from scipy.optimize import brentq

from app.errors import AccuracyNotReached
from app.model.boundary import LookAsUsed
from app.model.outlook import Stopping
from app.model.values import Absent, Estimate
from app.sequential.density import Region, start
from app.sequential.rules import Direction, EfficacyRule

_TOLERANCE = 1e-12  # of the root, in standard deviations of z
_FARTHEST = 40.0  # standard deviations from the naive estimate at which the search gives up


@dataclass(frozen=True)
class Ended:
    """Where a trial ended: information in any one unit, regions of the looks before, z at the last look."""

    information: tuple[float, ...]
    regions: tuple[Region, ...]
    z: float

    def __post_init__(self) -> None:
        if len(self.regions) != len(self.information) - 1:
            raise ValueError("every look but the last needs a region")

    def probability_of_more(self, drift: float) -> float:
        """P(a result that says as much for the experimental arm, or more) under this drift."""
        course, beyond = start(drift), 0.0
        for at, region in zip(self.information, self.regions, strict=False):
            beyond += course.before(at).above(at, region.upper)
            course = course.then(at, region)
        last = self.information[-1]
        return beyond + course.before(last).above(last, self.z)

    def drift_with(self, probability: float) -> float:
        """The drift under which that probability has this value; it rises with the drift."""
        scale = math.sqrt(self.information[-1])

        def excess(mean: float) -> float:
            return self.probability_of_more(mean / scale) - probability

        low, high = _bracket(excess, self.z)
        return float(brentq(excess, low, high, xtol=_TOLERANCE, rtol=1e-14)) / scale


def _bracket(excess: Callable[[float], float], start_from: float) -> tuple[float, float]:
    """Two means of the last z around the root, searched outwards from the naive one."""
    low, high, step = start_from - 1.0, start_from + 1.0, 1.0
    while excess(low) > 0.0 or excess(high) < 0.0:
        step *= 2.0
        low = low - step if excess(low) > 0.0 else low
        high = high + step if excess(high) < 0.0 else high
        if step > _FARTHEST:
            raise AccuracyNotReached(
                "no effect explains the end of the trial", found=f"z {start_from:.3f} at the last look"
            )
    return low, high


def stopping(
    past: Sequence[LookAsUsed],
    z: float,
    information: float,
    rule: EfficacyRule,
    score_variance: Estimate,
    *,
    binding: bool = False,
) -> Stopping:
    """p, median-unbiased hazard ratio and interval, as if the trial ended at this look.

    Parameters
    ----------
    past : the looks before, in order, with their bounds as used
    z, information : of the look at which the trial ends, information above that of every look with a bound
    rule : the efficacy rule of the plan
    score_variance : V observed, or why there is none
    binding : whether futility bounds were binding; non-binding ones and harm are left out of account

    Notes
    -----
    *Convention*: p_one_sided = P(first crossing of efficacy before, or here a z at least as large) under no
    effect, so that at the bound it is the alpha spent. The median-unbiased ratio is the effect under which
    that probability is one half; the limits are those with a and 1 - a, a the level of one side. A drift
    becomes a ratio by I = V observed: log HR = -s drift sqrt(information / V). A trial that may have stopped
    for futility without being bound to makes the median not exactly unbiased.
    *Accuracy*: 1e-10 in probability. *Stopping rule*: 1e-12 in the mean of the last z.
    *Checked*: independent values (app/validation/sequential_rows.py), by simulation (tests/properties/).

    References
    ----------
    Tsiatis, Rosner & Mehta (1984), Biometrics 40, 797-803; Fairbanks & Madsen (1982), Biometrika 69, 69-74;
    Kim (1989), Biometrics 45, 613-617.
    """
    looks = [look for look in past if not _unbounded(look, binding)]
    ended = Ended(
        (*(look.information for look in looks), information),
        tuple(_region(look, rule, binding) for look in looks),
        z,
    )
    alpha, unit = rule.alpha_one_side, information_unit(information, score_variance)

    def ratio(probability: float) -> Estimate:
        if isinstance(unit, Absent):
            return unit
        return math.exp(-rule.direction * ended.drift_with(probability) * unit)

    favourable, unfavourable = ratio(1.0 - alpha), ratio(alpha)
    low, high = _ordered(favourable, unfavourable, rule.direction)
    return Stopping(ended.probability_of_more(0.0), ratio(0.5), low, high, 1.0 - 2.0 * alpha)


def information_unit(information: float, score_variance: Estimate) -> Estimate:
    """sqrt(information / V): from drift per unit of information to a log hazard ratio, up to its sign."""
    if isinstance(score_variance, Absent):
        return score_variance
    if score_variance <= 0.0:
        return Absent("the score variance is 0, so z does not correspond to a hazard ratio")
    return math.sqrt(information / score_variance)


def _ordered(favourable: Estimate, unfavourable: Estimate, direction: Direction) -> tuple[Estimate, Estimate]:
    """Smaller ratio first: the favourable one where the event is bad."""
    return (favourable, unfavourable) if direction == 1 else (unfavourable, favourable)


def _region(look: LookAsUsed, rule: EfficacyRule, binding: bool) -> Region:
    lower = look.futility_z if binding and not look.final else None
    return rule.region(look.efficacy_z, -math.inf if lower is None or isinstance(lower, Absent) else lower)


def _unbounded(look: LookAsUsed, binding: bool) -> bool:
    """Whether nothing could stop the trial at this look."""
    no_futility = look.futility_z is None or isinstance(look.futility_z, Absent)
    return isinstance(look.efficacy_z, Absent) and (no_futility or not binding)
