"""What going on would mean: conditional and predictive power, what the next look needs, repeated intervals.

Effects are noncentralities: the mean of z at full information. See DEVELOPERS.md, Methods: conditional power.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from scipy.special import ndtr, ndtri

from app.model.boundary import Bound
from app.model.outlook import ConditionalPower, NextLook, Outlook, PredictivePower, RepeatedInterval
from app.model.values import Absent, Estimate
from app.sequential.density import Region, crossing_probabilities
from app.sequential.effect import EffectScale, futility_obeyed
from app.sequential.rules import EfficacyRule, hazard_ratio_at

NO_LOOK_TO_COME = Absent("no planned look is to come")
NO_LAST_BOUND = Absent("the last look has no efficacy bound")


@dataclass(frozen=True)
class Held:
    """A look held: its information fraction in (0, 1), its z, and V observed or why there is none."""

    fraction: float
    z: float
    score_variance: Estimate


@dataclass(frozen=True)
class Prior:
    """A normal prior of the log hazard ratio, experimental / control."""

    hazard_ratio: float
    std_error: float


def outlook(
    held: Held,
    ahead: Sequence[Bound],
    rule: EfficacyRule,
    scale: EffectScale,
    *,
    planned_hazard_ratio: float,
    level: float,
    prior: Prior | None = None,
) -> Outlook | Absent:
    """Conditional power under the plan's effect, the trend and none, and what comes next.

    Parameters
    ----------
    held : the look now
    ahead : bounds at the planned looks to come, were they held as planned, the last of them final
    rule, scale : the efficacy rule of the plan, and its scale of effects
    planned_hazard_ratio : the plan's, experimental / control
    level : confidence of the trend's interval
    prior : for predictive power, optional

    Returns
    -------
    Outlook, or Absent where no planned look is to come.

    Notes
    -----
    *Convention*: all are probabilities of crossing the efficacy bound (of a two-sided test the upper one).
    The criterion of the final look is this trial's own last bound. The trend's interval is z plus and minus
    the normal quantile; its hazard ratio is that of the score, exp(-s z / sqrt V).
    *Accuracy*: 1e-10, as the recursion.
    *Checked*: against print and independent values (app/validation/sequential_rows.py), nested integrals
    (tests/precise/).

    References
    ----------
    Halperin, Lan, Ware, Johnson & DeMets (1982), Controlled Clinical Trials 3, 311-323; Lachin (2005),
    Statistics in Medicine 24, 2747-2764; Spiegelhalter, Freedman & Blackburn (1986), Controlled Clinical
    Trials 7, 8-17.
    """
    if not ahead:
        return NO_LOOK_TO_COME
    going_on = GoingOn(held, tuple(ahead), rule)
    margin = float(ndtri((1.0 + level) / 2.0))

    def planned(ratio: float) -> ConditionalPower:
        return going_on.power(scale.noncentrality(ratio), ratio)

    def at_trend(shift: float) -> ConditionalPower:
        z = held.z + shift
        ratio = hazard_ratio_at(z, held.score_variance, rule.direction)
        return going_on.power(z / math.sqrt(held.fraction), ratio)

    design, trend = planned(planned_hazard_ratio), at_trend(0.0)
    return Outlook(
        design=design,
        trend=trend,
        trend_low=at_trend(-margin),
        trend_high=at_trend(margin),
        null=planned(1.0),
        criterion=ahead[-1].efficacy_z,
        predictive_power=_predictive_power(held, ahead[-1], scale, prior),
        next_look=going_on.next_look(scale, design.noncentrality, trend.noncentrality),
    )


def conditional_power(
    held: Held, ahead: Sequence[Bound], rule: EfficacyRule, scale: EffectScale, hazard_ratio: float
) -> ConditionalPower | Absent:
    """The three conditional powers under one hazard ratio, experimental / control, as in `outlook`.

    Parameters
    ----------
    held, ahead, rule, scale : as for `outlook`
    hazard_ratio : above 0

    Returns
    -------
    ConditionalPower, or Absent where no planned look is to come.

    Notes
    -----
    *Convention*: the effect is -s log(HR) sqrt(I) with I of the plan at full information, as for the plan's
    own ratio, so that this ratio gives the very numbers of `Outlook.design`.
    *Accuracy*, *Checked*: as `outlook`.
    """
    if not ahead:
        return NO_LOOK_TO_COME
    return GoingOn(held, tuple(ahead), rule).power(scale.noncentrality(hazard_ratio), hazard_ratio)


@dataclass(frozen=True)
class GoingOn:
    """A look held and the bounds after it."""

    held: Held
    ahead: tuple[Bound, ...]
    rule: EfficacyRule

    def power(self, noncentrality: float, hazard_ratio: Estimate) -> ConditionalPower:
        """The three conditional powers under one effect."""
        efficacy = [self.rule.region(bound.efficacy_z) for bound in self.ahead]
        obeyed = [futility_obeyed(bound, self.rule) for bound in self.ahead]
        has_futility = any(bound.futility_z is not None for bound in self.ahead)
        return ConditionalPower(
            noncentrality=noncentrality,
            hazard_ratio=hazard_ratio,
            final_look=self._at_final_look(noncentrality),
            path=self._crossing(efficacy, noncentrality),
            path_futility_obeyed=self._crossing(obeyed, noncentrality) if has_futility else None,
        )

    def next_look(self, scale: EffectScale, design: float, trend: float) -> NextLook:
        """What the first of the looks ahead needs, and the chances that it is met."""
        bound = self.ahead[0]
        z = self._needed_of_new_events(bound)
        new_variance = (bound.information_fraction - self.held.fraction) * scale.full_score_variance
        chances = [self._met_at(bound, effect) for effect in (design, trend, 0.0)]
        return NextLook(
            number=bound.number,
            information_fraction=bound.information_fraction,
            events=bound.events,
            efficacy_z=bound.efficacy_z,
            efficacy_hazard_ratio=bound.efficacy_hazard_ratio,
            futility_z=bound.futility_z,
            new_events_z=z,
            new_events_hazard_ratio=hazard_ratio_at(z, new_variance, scale.direction),
            chance_design=chances[0],
            chance_trend=chances[1],
            chance_null=chances[2],
        )

    def _at_final_look(self, noncentrality: float) -> Estimate:
        last = self.ahead[-1]
        return NO_LAST_BOUND if isinstance(last.efficacy_z, Absent) else self._met_at(last, noncentrality)

    def _met_at(self, bound: Bound, noncentrality: float) -> Estimate:
        if isinstance(bound.efficacy_z, Absent):
            return bound.efficacy_z
        return conditional_power_at(
            self.held.z, self.held.fraction, bound.efficacy_z, bound.information_fraction, noncentrality
        )

    def _crossing(self, regions: Sequence[Region], noncentrality: float) -> float:
        fractions = [bound.information_fraction for bound in self.ahead]
        now = (self.held.fraction, self.held.z)
        return float(crossing_probabilities(fractions, regions, drift=noncentrality, after=now).upper.sum())

    def _needed_of_new_events(self, bound: Bound) -> Estimate:
        """The z of the score's increment up to the bound: (c sqrt t' - z sqrt t) / sqrt(t' - t)."""
        if isinstance(bound.efficacy_z, Absent):
            return bound.efficacy_z
        increment = bound.efficacy_z * math.sqrt(bound.information_fraction)
        increment -= self.held.z * math.sqrt(self.held.fraction)
        return increment / math.sqrt(bound.information_fraction - self.held.fraction)


def conditional_power_at(
    z: float, fraction: float, criterion: float, last_fraction: float, noncentrality: float
) -> float:
    """P(Z >= criterion at `last_fraction`, given z at `fraction`): no look between them.

    Notes
    -----
    *Convention*: the score of what is to come is normal, mean noncentrality (t' - t), variance t' - t.

    References
    ----------
    Lan, Simon & Halperin (1982), Communications in Statistics C 1, 207-219; Lan & Wittes (1988), Biometrics
    44, 579-585.

    Examples
    --------
    >>> round(conditional_power_at(1.5, 0.5, 1.959964, 1.0, 0.0), 4)
    0.1017
    """
    step = last_fraction - fraction
    distance = z * math.sqrt(fraction) + noncentrality * step - criterion * math.sqrt(last_fraction)
    return float(ndtr(distance / math.sqrt(step)))


def predictive_power_at(
    z: float,
    fraction: float,
    criterion: float,
    last_fraction: float,
    prior: tuple[float, float] | None = None,
) -> float:
    """Conditional power at the final look, averaged over what the noncentrality may be given this look.

    Parameters
    ----------
    z, fraction : the look now, fraction in (0, `last_fraction`)
    criterion, last_fraction : the bound to be met and where
    prior : mean and standard deviation of the noncentrality; flat by default

    Notes
    -----
    With precision w of the prior the effect is normal, mean (w m + z sqrt t) / (w + t), variance 1 / (w + t).

    References
    ----------
    Spiegelhalter, Freedman & Blackburn (1986), Controlled Clinical Trials 7, 8-17.

    Examples
    --------
    >>> round(predictive_power_at(1.5, 0.5, 1.959964, 1.0), 4)
    0.5641
    """
    mean, deviation = prior if prior is not None else (0.0, math.inf)
    weight = 0.0 if math.isinf(deviation) else deviation**-2
    precision = weight + fraction
    effect = (weight * mean + z * math.sqrt(fraction)) / precision
    step = last_fraction - fraction
    distance = z * math.sqrt(fraction) + effect * step - criterion * math.sqrt(last_fraction)
    return float(ndtr(distance / math.sqrt(step + step**2 / precision)))


def _predictive_power(held: Held, last: Bound, scale: EffectScale, prior: Prior | None) -> PredictivePower:
    if isinstance(last.efficacy_z, Absent):
        return PredictivePower(NO_LAST_BOUND, None if prior is None else NO_LAST_BOUND)
    place = held.z, held.fraction, last.efficacy_z, last.information_fraction
    believed = None
    if prior is not None:
        spread = prior.std_error * math.sqrt(scale.full_score_variance)
        believed = predictive_power_at(*place, prior=(scale.noncentrality(prior.hazard_ratio), spread))
    return PredictivePower(predictive_power_at(*place), believed)


def repeated_interval(
    z: float, bound: Bound, rule: EfficacyRule, score_variance: Estimate
) -> RepeatedInterval:
    """Interval of the hazard ratio from z plus and minus the efficacy bound of this look.

    Notes
    -----
    *Convention*: exp(-s (z +- c) / sqrt V), V observed; level 1 - 2a, a of one side. It holds at every look
    at once, whatever is decided; where the look has no efficacy bound there is no such interval.

    References
    ----------
    Jennison & Turnbull (1989), JRSS B 51, 305-361.
    """
    c = bound.efficacy_z
    unfavourable: Estimate = c if isinstance(c, Absent) else z - c
    favourable: Estimate = c if isinstance(c, Absent) else z + c
    ends = [hazard_ratio_at(end, score_variance, rule.direction) for end in (favourable, unfavourable)]
    low, high = ends if rule.direction == 1 else ends[::-1]
    return RepeatedInterval(low, high, 1.0 - 2.0 * rule.alpha_one_side)
