"""Slow, literal versions of the estimators: loops over subjects, straight from the definitions.

They share no code with the program. Counts, curves and log-rank sums stay exact when fractions are wanted.
Checked by hand in tests/byhand.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from fractions import Fraction
from itertools import combinations, pairwise
from typing import NamedTuple


class CurveRow(NamedTuple):
    time: float
    at_risk: int
    events: int
    censored: int
    survival: Fraction
    variance_of_log: Fraction | None  # None once nobody is left after an event


def kaplan_meier(time: Sequence[float], event: Sequence[bool]) -> list[CurveRow]:
    """Kaplan & Meier (1958) with Greenwood's sum, one row per distinct time."""
    rows, survival, greenwood = [], Fraction(1), Fraction(0)
    for at in sorted(set(time)):
        at_risk = sum(1 for t in time if t >= at)
        events = sum(1 for t, e in zip(time, event, strict=True) if t == at and e)
        censored = sum(1 for t, e in zip(time, event, strict=True) if t == at and not e)
        survival *= 1 - Fraction(events, at_risk)
        if survival > 0:
            greenwood += Fraction(events, at_risk * (at_risk - events)) if events else 0
        rows.append(CurveRow(at, at_risk, events, censored, survival, greenwood if survival > 0 else None))
    return rows


def median(rows: Sequence[CurveRow]) -> float | None:
    """First time with survival below one half; the middle of a stretch at one half that ends in an event."""
    for row in rows:
        if row.survival < Fraction(1, 2):
            return row.time
        if row.survival == Fraction(1, 2):
            later = [other.time for other in rows if other.survival < Fraction(1, 2)]
            return (row.time + later[0]) / 2 if later else row.time
    return None


def follow_up_median(time: Sequence[float], event: Sequence[bool]) -> float | None:
    """Median of the curve in which the censored have the event (Schemper & Smith 1996)."""
    return median(kaplan_meier(time, [not e for e in event]))


def logrank(
    time: Sequence[float],
    event: Sequence[bool],
    experimental: Sequence[bool],
    stratum: Sequence[int] | None = None,
) -> tuple[int, Fraction, Fraction]:
    """Observed, expected and hypergeometric variance of the experimental arm (Mantel 1966)."""
    subjects = list(zip(time, event, experimental, stratum or [0] * len(time), strict=True))
    observed, expected, variance = 0, Fraction(0), Fraction(0)
    for code in {s for *_, s in subjects}:
        inside = [(t, e, x) for t, e, x, s in subjects if s == code]
        for at in {t for t, e, _ in inside if e}:
            n = sum(1 for t, _, _ in inside if t >= at)
            n1 = sum(1 for t, _, x in inside if t >= at and x)
            d = sum(1 for t, e, _ in inside if t == at and e)
            observed += sum(1 for t, e, x in inside if t == at and e and x)
            expected += Fraction(d * n1, n)
            if n > 1:
                variance += Fraction(d * n1 * (n - n1) * (n - d), n * n * (n - 1))
    return observed, expected, variance


class Term(NamedTuple):
    """One factor of the partial likelihood: the weights of control and experimental subjects in it."""

    control: Fraction
    experimental: Fraction


def partial_likelihood_terms(
    time: Sequence[float],
    event: Sequence[bool],
    experimental: Sequence[bool],
    stratum: Sequence[int] | None = None,
    ties: str = "Efron",
) -> list[Term]:
    """Every denominator of the partial likelihood (Efron 1977; Breslow 1974), as weights of the two arms."""
    subjects = list(zip(time, event, experimental, stratum or [0] * len(time), strict=True))
    terms = []
    for code in {s for *_, s in subjects}:
        inside = [(t, e, x) for t, e, x, s in subjects if s == code]
        for at in {t for t, e, _ in inside if e}:
            dying = [x for t, e, x in inside if t == at and e]
            risk_set = [x for t, _, x in inside if t >= at]
            for k in range(len(dying)):
                gone = Fraction(k, len(dying)) if ties == "Efron" else Fraction(0)
                terms.append(
                    Term(
                        control=risk_set.count(False) - gone * dying.count(False),
                        experimental=risk_set.count(True) - gone * dying.count(True),
                    )
                )
    return terms


def cox(
    time: Sequence[float],
    event: Sequence[bool],
    experimental: Sequence[bool],
    stratum: Sequence[int] | None = None,
    ties: str = "Efron",
) -> tuple[float, float]:
    """Log hazard ratio by bisection of the score between -60 and 60, and its standard error."""
    terms = partial_likelihood_terms(time, event, experimental, stratum, ties)
    observed = sum(1 for e, x in zip(event, experimental, strict=True) if e and x)

    def probabilities(log_ratio: float) -> list[float]:
        theta = math.exp(log_ratio)
        return [
            float(t.experimental) * theta / (float(t.control) + float(t.experimental) * theta) for t in terms
        ]

    low, high = -60.0, 60.0
    while high - low > 1e-14 * max(1.0, abs(low)):
        middle = (low + high) / 2
        if middle in (low, high):
            break
        low, high = (middle, high) if math.fsum(probabilities(middle)) < observed else (low, middle)
    information = math.fsum(p * (1 - p) for p in probabilities(low))
    return low, 1 / math.sqrt(information)


def merge_near_ties(time: Sequence[float]) -> list[float]:
    """Walk up the distinct times; one that is no further than the tolerance from the last joins its group."""
    distinct = sorted(set(time))
    tolerance = 2.0**-26 * max(1.0, sum(distinct) / len(distinct)) if distinct else 0.0
    smallest: dict[float, float] = {}
    for before, at in zip([None, *distinct], distinct, strict=False):
        joins = before is not None and at - before <= tolerance
        smallest[at] = smallest[before] if joins else at  # type: ignore[index]
    return [smallest[t] for t in time]


def normal_tail(z: float) -> float:
    """P(Z > z) of a standard normal."""
    return math.erfc(z / math.sqrt(2)) / 2


def two_look_crossing(
    first_fraction: float, first_bound: float, last_bound: float, sides: int = 1, cells: int = 20_000
) -> float:
    """P(z stays inside at the first look and is above the last bound at the end), by trapezoids."""
    low = -first_bound if sides == 2 else -12.0
    width = (first_bound - low) / cells
    total = 0.0
    for cell in range(cells + 1):
        z = low + cell * width
        end = 0.5 if cell in (0, cells) else 1.0
        density = math.exp(-z * z / 2) / math.sqrt(2 * math.pi)
        onwards = (last_bound - z * math.sqrt(first_fraction)) / math.sqrt(1 - first_fraction)
        total += end * width * density * normal_tail(onwards)
    return total


def two_look_boundary(
    first_fraction: float, spent_first: float, alpha_one_side: float, sides: int = 1
) -> tuple[float, float]:
    """Bounds at one interim look and the end that spend alpha (Lan & DeMets 1983), by bisection."""

    def solve(tail_at: Callable[[float], float], spend: float) -> float:
        low, high = 0.0, 12.0
        for _ in range(45):
            middle = (low + high) / 2
            low, high = (middle, high) if tail_at(middle) > spend else (low, middle)
        return low

    first = solve(normal_tail, spent_first)
    last = solve(
        lambda z: two_look_crossing(first_fraction, first, z, sides, cells=2_000),
        alpha_one_side - spent_first,
    )
    return first, last


def pooled_survival_before(time: Sequence[float], event: Sequence[bool], at: float) -> Fraction:
    """The Kaplan-Meier curve of all subjects just before a time."""
    earlier = [row for row in kaplan_meier(time, event) if row.time < at]
    return earlier[-1].survival if earlier else Fraction(1)


def weighted_logrank(
    time: Sequence[float],
    event: Sequence[bool],
    experimental: Sequence[bool],
    weight: Callable[[int, int, Fraction], float],
    stratum: Sequence[int] | None = None,
) -> tuple[float, float]:
    """Score and variance with a weight of (at risk, events, curve just before) at each event time."""
    subjects = list(zip(time, event, experimental, stratum or [0] * len(time), strict=True))
    score, variance = 0.0, 0.0
    for code in {s for *_, s in subjects}:
        inside = [(t, e, x) for t, e, x, s in subjects if s == code]
        for at in {t for t, e, _ in inside if e}:
            n = sum(1 for t, _, _ in inside if t >= at)
            n1 = sum(1 for t, _, x in inside if t >= at and x)
            d = sum(1 for t, e, _ in inside if t == at and e)
            d1 = sum(1 for t, e, x in inside if t == at and e and x)
            before = pooled_survival_before([t for t, _, _ in inside], [e for _, e, _ in inside], at)
            w = weight(n, d, before)
            score += w * float(d1 - Fraction(d * n1, n))
            if n > 1:
                variance += w * w * float(Fraction(d * n1 * (n - n1) * (n - d), n * n * (n - 1)))
    return score, variance


def cumulative_hazard(time: Sequence[float], event: Sequence[bool]) -> list[tuple[Fraction, Fraction]]:
    """Nelson-Aalen and Aalen's variance, one pair per distinct time."""
    pairs, hazard, variance = [], Fraction(0), Fraction(0)
    for row in kaplan_meier(time, event):
        hazard += Fraction(row.events, row.at_risk)
        variance += Fraction(row.events, row.at_risk**2)
        pairs.append((hazard, variance))
    return pairs


def survival_at(rows: Sequence[CurveRow], at: float) -> Fraction:
    reached = [row.survival for row in rows if row.time <= at]
    return reached[-1] if reached else Fraction(1)


def area(rows: Sequence[CurveRow], start: float, end: float) -> float:
    """The area under the curve between two times, step by step."""
    cuts = sorted({start, end, *(row.time for row in rows if start < row.time < end)})
    return sum(float(survival_at(rows, low)) * (high - low) for low, high in pairwise(cuts))


def restricted_mean(time: Sequence[float], event: Sequence[bool], at: float) -> tuple[float, float]:
    """Mean up to a time and its variance (Irwin 1949)."""
    rows = kaplan_meier(time, event)
    variance = sum(
        area(rows, row.time, at) ** 2 * row.events / (row.at_risk * (row.at_risk - row.events))
        for row in rows
        if row.events and row.time < at and row.at_risk > row.events
    )
    return area(rows, 0.0, at), variance


def log_partial_likelihood(
    time: Sequence[float],
    event: Sequence[bool],
    predictor: Sequence[float],
    stratum: Sequence[int],
    ties: str,
) -> float:
    """The log partial likelihood at covariates . coefficients = `predictor`, straight from the
    definitions.
    """
    total = 0.0
    for code in set(stratum):
        inside = [i for i, s in enumerate(stratum) if s == code]
        for at in {time[i] for i in inside if event[i]}:
            dying = [i for i in inside if time[i] == at and event[i]]
            at_risk = [i for i in inside if time[i] >= at]
            total += sum(predictor[i] for i in dying)
            total -= _log_denominator(at_risk, dying, predictor, ties)
    return total


def _log_denominator(at_risk: list[int], dying: list[int], predictor: Sequence[float], ties: str) -> float:
    if ties == "exact":
        subsets = combinations(at_risk, len(dying))
        return math.log(sum(math.exp(sum(predictor[i] for i in subset)) for subset in subsets))
    everybody, gone = (sum(math.exp(predictor[i]) for i in some) for some in (at_risk, dying))
    share = [k / len(dying) if ties == "Efron" else 0.0 for k in range(len(dying))]
    return sum(math.log(everybody - one * gone) for one in share)


def proportionality(
    time: Sequence[float],
    event: Sequence[bool],
    experimental: Sequence[bool],
    log_ratio: float,
    scale: Callable[[float], float],
) -> float:
    """Chi-square of the score test for a log ratio that changes along `scale` (Grambsch & Therneau 1994)."""
    subjects = list(zip(time, event, experimental, strict=True))
    score = 0.0
    information = [[0.0, 0.0], [0.0, 0.0]]
    for at in {t for t, e, _ in subjects if e}:
        g = scale(at)
        dying = [x for t, e, x in subjects if t == at and e]
        for k in range(len(dying)):
            weight = {x: sum(1 for t, _, y in subjects if t >= at and y == x) for x in (False, True)}
            weight = {x: weight[x] - k / len(dying) * dying.count(x) for x in weight}
            one = weight[True] * math.exp(log_ratio)
            share = one / (weight[False] + one)
            score -= g * share
            for i, a in enumerate((1.0, g)):
                for j, b in enumerate((1.0, g)):
                    information[i][j] += a * b * share * (1 - share)
        score += g * sum(dying)
    left = information[1][1] - information[0][1] ** 2 / information[0][0]
    return score * score / left


def cumulative_incidence(
    time: Sequence[float], cause: Sequence[int], of: int
) -> list[tuple[float, Fraction]]:
    """Aalen & Johansen (1978): the curve of no event at all before each time, times the hazard of the
    cause.
    """
    found, incidence = [], Fraction(0)
    for at in sorted({t for t, c in zip(time, cause, strict=True) if c}):
        n = sum(1 for t in time if t >= at)
        d = sum(1 for t, c in zip(time, cause, strict=True) if t == at and c == of)
        incidence += pooled_survival_before(time, [c > 0 for c in cause], at) * Fraction(d, n)
        found.append((at, incidence))
    return found
