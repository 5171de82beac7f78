"""The joint law of the score at successive looks, by recursive integration (Armitage, McPherson & Rowe 1969).

The score S = z sqrt(I) moves from look to look by independent normal steps with mean drift * (I' - I) and
variance I' - I (Tsiatis 1981). The density of the paths that no look has stopped is carried forward by
Gauss-Legendre quadrature over the region where the trial goes on; a crossing probability is always a sum of
upper or lower tails, never one minus something, so that it keeps its digits however small it is.
See DEVELOPERS.md, Methods: recursive integration.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from functools import lru_cache

import numpy as np
from scipy.special import log_ndtr, ndtr, ndtri

from app.errors import AccuracyNotReached
from app.model.values import Floats, read_only

ACCURACY = 1e-10  # promised, in probability

_REACH = 8.5  # standard deviations integrated where there is no bound: the rest holds 1e-17
_FARTHEST = 38.5  # standard deviations beyond which no double holds a normal tail
_PANEL_WIDTH = 32.0  # longest panel, in widths of the integrand
_NODES_PER_WIDTH = 1.6  # with _NODES_AT_LEAST: doubling both moves no probability by 1e-14
_NODES_AT_LEAST = 14
_MOST_NODES = 200_000
_BLOCK = 256  # target nodes whose kernel is formed at once
_MOST_ITERATIONS = 100


@dataclass(frozen=True)
class Region:
    """Where the trial goes on at one look: lower < z < upper, infinite where that side has no bound."""

    lower: float = -math.inf
    upper: float = math.inf

    def __post_init__(self) -> None:
        if not self.lower < self.upper:
            raise ValueError(f"a region needs lower < upper, got {self.lower!r} and {self.upper!r}")

    @property
    def whole(self) -> bool:
        """Whether nothing stops here; such a look leaves the law of every other look as it is."""
        return math.isinf(self.lower) and math.isinf(self.upper)


@dataclass(frozen=True, eq=False)
class Paths:
    """Paths not stopped so far, at `information`: each `score` node stands for the probability `mass`.

    Arrays of shape (n,). `drift` is the mean of the score per unit of information: E z = drift * sqrt(I).
    All paths began at `origin`, an information and a score: (0, 0), or a look held.
    """

    information: float
    score: Floats
    mass: Floats
    drift: float = 0.0
    origin: tuple[float, float] = (0.0, 0.0)

    @property
    def unstopped(self) -> float:
        """Probability of having come so far."""
        return float(self.mass.sum())

    def above(self, information: float, z: float) -> float:
        """P(not stopped so far, Z >= z at `information`)."""
        return float((self.mass * ndtr(-self._standard(information, z))).sum())

    def below(self, information: float, z: float) -> float:
        """P(not stopped so far, Z <= z at `information`)."""
        return float((self.mass * ndtr(self._standard(information, z))).sum())

    def mirrored(self) -> Paths:
        """The same paths with up and down exchanged."""
        began, at = self.origin
        return Paths(self.information, -self.score[::-1], self.mass[::-1], -self.drift, (began, -at))

    def _standard(self, information: float, z: float) -> Floats:
        """How many standard deviations of the step lie between each path and z."""
        step = information - self.information
        return (z * math.sqrt(information) - self.drift * step - self.score) / math.sqrt(step)


@dataclass(frozen=True, eq=False)
class Course:
    """A trial's looks so far: paths up to the last look but one, and where the last look lets them go on.

    The last region waits, because its nodes must be fine enough for the step that follows it.
    """

    paths: Paths
    information: float = 0.0
    region: Region | None = None
    refinement: int = 1
    carried: dict[float, Paths] = field(
        default_factory=dict, repr=False
    )  # the bound and the look after ask alike

    def before(self, information: float) -> Paths:
        """The paths that reach a next look at `information`."""
        if not information > self.information:
            raise ValueError(f"information must exceed {self.information!r}, got {information!r}")
        if self.region is None:
            return self.paths
        if information not in self.carried:
            self.carried[information] = _carry(
                self.paths, self.information, self.region, information, self.refinement
            )
        return self.carried[information]

    def then(self, information: float, region: Region) -> Course:
        """The course with one more look, at which the trial goes on inside `region`."""
        if region.whole:
            return self
        return Course(self.before(information), information, region, self.refinement)


def start(drift: float = 0.0, refinement: int = 1) -> Course:
    """Before the first look: score 0 at information 0. `refinement` multiplies the nodes of each panel."""
    return _course_from(0.0, 0.0, drift, refinement)


def start_at(information: float, z: float, drift: float = 0.0, refinement: int = 1) -> Course:
    """From a look held at `information` > 0 with this z: what follows is conditional on it."""
    return _course_from(information, z * math.sqrt(information), drift, refinement)


def _course_from(information: float, score: float, drift: float, refinement: int) -> Course:
    begun = read_only([score], np.float64), read_only([1.0], np.float64)
    paths = Paths(information, *begun, drift, origin=(information, score))
    return Course(paths, information, refinement=refinement)


@dataclass(frozen=True, eq=False)
class Crossings:
    """Probability of first leaving the region at each look, upwards and downwards; arrays of shape (K,)."""

    upper: Floats
    lower: Floats

    @property
    def going_on(self) -> Floats:
        """Probability of passing each look unstopped, shape (K,)."""
        return np.asarray(1.0 - np.cumsum(self.upper + self.lower))


def crossing_probabilities(
    information: Sequence[float],
    regions: Sequence[Region],
    *,
    drift: float = 0.0,
    refinement: int = 1,
    after: tuple[float, float] | None = None,
) -> Crossings:
    """Probabilities of first leaving the regions, look by look, under any drift.

    Parameters
    ----------
    information : K floats, positive, increasing, any unit; correlations are sqrt(I_i / I_j)
    regions : K regions in z
    drift : float; the mean of z at information I is drift * sqrt(I)
    refinement : int >= 1; multiplies the quadrature nodes
    after : (information, z) of a look held, below all of these; the probabilities are then conditional on it

    Raises
    ------
    ValueError : information is not positive and increasing - a bug in the caller.
    AccuracyNotReached : two looks lie so close together that the nodes would not suffice.

    Notes
    -----
    *Accuracy*: absolute error below 1e-10 (stated), below 1e-13 on every plan tested; under no drift tail
    probabilities down to 1e-20 are right to a relative 1e-10. Doubling the nodes moves nothing by 1e-13.
    *Checked*: nested integrals at 30 digits, multivariate normal, a trapezoid rule (tests/precise/).

    References
    ----------
    Armitage, McPherson & Rowe (1969), JRSS A 132, 235-244; Jennison & Turnbull (2000), chapter 19.
    """
    upper, lower = np.zeros(len(information)), np.zeros(len(information))
    course = start(drift, refinement) if after is None else start_at(*after, drift, refinement)
    for look, (at, region) in enumerate(zip(information, regions, strict=True)):
        if region.whole:
            continue
        paths = course.before(at)
        upper[look], lower[look] = paths.above(at, region.upper), paths.below(at, region.lower)
        course = Course(paths, at, region, refinement)
    return Crossings(read_only(upper, np.float64), read_only(lower, np.float64))


def upper_bound_for(paths: Paths, information: float, spend: float) -> float:
    """The z that paths not stopped so far exceed at `information` with probability `spend`.

    Notes
    -----
    The logarithm of the tail is concave and falling, because truncation to intervals and normal steps keep
    a density log-concave. Newton's method from the right of the root therefore falls to it without overshoot,
    and the bound of a trial that never looked before lies to the right.
    *Stopping rule*: a step below 1e-14 of z, or a rise, which only rounding can cause.

    Raises
    ------
    AccuracyNotReached : no convergence, or more spend asked for than paths are left.
    """
    target = math.log(spend)
    z = paths.drift * math.sqrt(information) - float(ndtri(spend))
    if spend < paths.unstopped:
        log_mass = np.log(paths.mass)
        for _ in range(_MOST_ITERATIONS):
            log_tail, log_slope = _log_tail(paths, log_mass, information, z)
            step = (log_tail - target) * math.exp(log_tail - log_slope)
            z += step
            if step >= -1e-14 * max(1.0, abs(z)):
                return z
    raise AccuracyNotReached(
        "the bound was not found",
        where=f"the look at information {information:.6g}",
        found=f"alpha to spend {spend:.3g} with probability {paths.unstopped:.3g} of being unstopped",
        accepted="alpha below that probability",
        remedy="check the bounds of the looks already held",
    )


def lower_bound_for(paths: Paths, information: float, spend: float) -> float:
    """The z that paths not stopped so far stay below at `information` with probability `spend`."""
    return -upper_bound_for(paths.mirrored(), information, spend)


def _log_tail(paths: Paths, log_mass: Floats, information: float, z: float) -> tuple[float, float]:
    """Logarithms of P(unstopped, Z >= z) and of its fall per unit of z."""
    standard = paths._standard(information, z)
    scale = math.log(information / (information - paths.information) / (2.0 * math.pi)) / 2.0
    return (
        _log_sum(log_mass + log_ndtr(-standard)),
        _log_sum(log_mass - standard * standard / 2.0) + scale,
    )


def _log_sum(logs: Floats) -> float:
    """Logarithm of the sum of exponentials."""
    largest = float(logs.max())
    return largest + math.log(float(np.exp(logs - largest).sum()))


def _carry(paths: Paths, information: float, region: Region, ahead: float, refinement: int) -> Paths:
    """Paths that survive `region` at `information`, on nodes fine enough for a step to `ahead`."""
    width = 1.0 / math.sqrt(1.0 / (information - paths.information) + 1.0 / (ahead - information))
    low, high = _extent(region, *_law_unstopped(paths, information))
    node, weight = _nodes(low * math.sqrt(information), high * math.sqrt(information), width, refinement)
    mass = _density(paths, information, node) * weight
    kept = mass > 0.0
    survivors = Paths(information, node[kept], mass[kept], paths.drift, paths.origin)
    _check_conserved(paths, survivors, region)
    return survivors


def _law_unstopped(paths: Paths, information: float) -> tuple[float, float]:
    """Mean and standard deviation of z at `information`, were there no bounds on the way."""
    began, at = paths.origin
    onwards = information - began
    return (at + paths.drift * onwards) / math.sqrt(information), math.sqrt(onwards / information)


def _extent(region: Region, mean: float, deviation: float) -> tuple[float, float]:
    """The stretch of z to integrate: up to the bounds, or as far as a double can tell."""
    centre = min(max(mean, region.lower), region.upper)
    down = deviation * (_REACH if math.isinf(region.lower) else _FARTHEST)
    up = deviation * (_REACH if math.isinf(region.upper) else _FARTHEST)
    return max(region.lower, centre - down), min(region.upper, centre + up)


def _nodes(low: float, high: float, width: float, refinement: int) -> tuple[Floats, Floats]:
    """Gauss-Legendre nodes and weights on equal panels of [low, high] for an integrand of this width."""
    panels = math.ceil((high - low) / (_PANEL_WIDTH * width))
    half = (high - low) / panels / 2.0
    count = _NODES_AT_LEAST + math.ceil(_NODES_PER_WIDTH * 2.0 * half / width)
    if panels * count > _MOST_NODES:
        raise AccuracyNotReached(
            "two looks lie too close together for the boundary",
            found=f"{panels * count} quadrature nodes needed",
            accepted=f"at most {_MOST_NODES}",
            remedy="leave one of the two looks out",
        )
    node, weight = _legendre(count * refinement)
    centre = low + half * (2.0 * np.arange(panels) + 1.0)
    return (centre[:, None] + half * node).ravel(), np.tile(half * weight, panels)


@lru_cache(maxsize=256)
def _legendre(count: int) -> tuple[Floats, Floats]:
    """Gauss-Legendre nodes and weights on [-1, 1]."""
    node, weight = np.polynomial.legendre.leggauss(count)
    return read_only(node, np.float64), read_only(weight, np.float64)


def _density(paths: Paths, information: float, score: Floats) -> Floats:
    """Density at `score`, ascending, shape (n,), of paths not stopped before `information`."""
    variance = information - paths.information
    density = np.zeros_like(score)
    if not paths.score.size:
        return density  # a look that let no double's worth of paths through
    for targets, sources in _bands(paths, information, score):
        distance = np.subtract.outer(score[targets] - paths.drift * variance, paths.score[sources])
        distance *= distance
        distance *= -0.5 / variance
        np.exp(distance, out=distance)
        density[targets] = np.einsum("ij,j->i", distance, paths.mass[sources])
    return density / math.sqrt(2.0 * math.pi * variance)


def _bands(paths: Paths, information: float, score: Floats) -> Iterator[tuple[slice, slice]]:
    """Blocks of target nodes, each with the source nodes from which a path can get there."""
    step = information - paths.information
    onwards = information - paths.origin[0]
    reach = (_REACH + 1.0 + _FARTHEST * math.sqrt(step / onwards)) * math.sqrt(step)
    shift = paths.drift * step
    for first in range(0, score.size, _BLOCK):
        block = score[first : first + _BLOCK]
        low = min(block[0] - shift, paths.score[-1]) - reach
        high = max(block[-1] - shift, paths.score[0]) + reach
        begin, end = np.searchsorted(paths.score, (low, high))
        yield slice(first, first + _BLOCK), slice(begin, end)


def _check_conserved(before: Paths, after: Paths, region: Region) -> None:
    """No probability is lost: what survives and what leaves make up what came."""
    upper = before.above(after.information, region.upper)
    lower = before.below(after.information, region.lower)
    lost = abs(float(after.mass.sum()) + upper + lower - float(before.mass.sum()))
    if not lost <= ACCURACY / 10.0:
        raise AccuracyNotReached(
            "the density of the unstopped paths lost probability",
            where=f"the look at information {after.information:.6g}",
            found=f"{lost:.1g} lost",
            accepted=f"at most {ACCURACY / 10.0:.0g}",
            remedy="space the looks further apart",
        )
