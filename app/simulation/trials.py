"""Whole trials on invented patients: looks by event count, the program's own log-rank, the plan's bounds."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np

from app.model.boundary import Bound
from app.model.plan import Sides
from app.model.values import Absent, Bools, Estimate, Floats
from app.simulation.patients import Patients, Population, draw_patients
from app.survival import logrank

TRIALS_AT_ONCE = 500


@dataclass(frozen=True)
class Rate:
    """How often something happened in so many trials."""

    count: int
    trials: int

    @property
    def value(self) -> float:
        return self.count / self.trials

    def std_error(self, expected: float) -> float:
        """Monte Carlo standard error of the rate, were `expected` the truth."""
        return math.sqrt(expected * (1.0 - expected) / self.trials)

    def distance(self, expected: float) -> float:
        """How many of those standard errors the rate lies above `expected`."""
        return (self.value - expected) / self.std_error(expected)


@dataclass(frozen=True)
class Rates:
    """How often trials ended at each kind of bound; `control` is of two-sided tests."""

    efficacy: Rate
    futility: Rate
    control: Rate


def simulated_z(
    population: Population,
    events: Sequence[int],
    trials: int,
    randomness: np.random.Generator,
    *,
    stratified: bool = False,
    direction: Literal[1, -1] = 1,
) -> Floats:
    """z of the log-rank test at each look of many trials; no bound stops them.

    Parameters
    ----------
    population : who is in each trial
    events : event counts, increasing; a look is held when the event that reaches its count has happened
    trials : how many
    randomness : the only source of chance; the same generator state gives the same numbers
    stratified : whether the test is stratified, as the population is
    direction : 1 when the event is bad, -1 when it is good

    Returns
    -------
    float array, shape (trials, looks)

    Raises
    ------
    ValueError : a trial whose patients never have so many events; plan more subjects or less drop-out.
    """
    parts = []
    for first in range(0, trials, TRIALS_AT_ONCE):
        patients = draw_patients(population, min(TRIALS_AT_ONCE, trials - first), randomness)
        cutoffs = _cutoffs(patients, events)
        for trial in range(cutoffs.shape[0]):
            one = _Trial(patients, trial, stratified)
            parts.append([one.z_at(cutoff, direction) for cutoff in cutoffs[trial]])
    return np.array(parts)


def _cutoffs(patients: Patients, events: Sequence[int]) -> Floats:
    """When the event that reaches each count happens; shape (trials, looks)."""
    order = np.asarray(events) - 1
    cutoffs = np.partition(patients.event_calendar, order, axis=1)[:, order]
    if not np.isfinite(cutoffs).all():
        subjects = patients.entry.shape[1]
        raise ValueError(f"not every trial of {subjects} patients reaches {max(events)} events")
    return cutoffs


class _Trial:
    """The patients of one trial, as a look at it sees them."""

    def __init__(self, patients: Patients, trial: int, stratified: bool) -> None:
        self.entry = patients.entry[trial]
        self.event = patients.event[trial]
        self.leaves = patients.leaves[trial]
        self.calendar = self.entry + self.event
        self.experimental = patients.experimental[trial]
        self.stratum = patients.stratum[trial] if stratified else None

    def z_at(self, cutoff: float, direction: Literal[1, -1]) -> float:
        """z of those who have entered, each followed to event, drop-out or the cutoff."""
        here = self.entry < cutoff
        seen = self.calendar[here] <= cutoff
        censored = np.minimum(self.leaves[here], cutoff - self.entry[here])
        time = np.where(seen, self.event[here], censored)
        stratum = None if self.stratum is None else self.stratum[here]
        return logrank(time, seen, self.experimental[here], stratum=stratum, direction=direction).z


def rates(z: Floats, bounds: Sequence[Bound], sides: Sides = 1, *, obey_futility: bool = True) -> Rates:
    """How often trials with these z, shape (trials, looks), end at each kind of bound.

    A trial ends at the first look whose bound it meets; futility is obeyed unless told otherwise.
    """
    efficacy = _ends(z, [_upwards(bound.efficacy_z) for bound in bounds])
    control = _ends(-z, [_upwards(bound.efficacy_z) if sides == 2 else math.inf for bound in bounds])
    futility = _ends(-z, [_futility(bound) if obey_futility else math.inf for bound in bounds])
    first = np.argmax(efficacy | control | futility, axis=1)
    rows = np.arange(z.shape[0])
    return Rates(*(_rate(kind[rows, first]) for kind in (efficacy, futility, control)))


def _ends(z: Floats, bounds: Sequence[float]) -> Bools:
    return np.asarray(z >= np.asarray(bounds), dtype=np.bool_)


def _upwards(z: Estimate) -> float:
    return math.inf if isinstance(z, Absent) else z


def _futility(bound: Bound) -> float:
    """The futility bound upside down; at the final look what is not efficacy is no stop of its own."""
    z = bound.futility_z
    return math.inf if z is None or isinstance(z, Absent) or bound.final else -z


def _rate(happened: Bools) -> Rate:
    return Rate(int(happened.sum()), happened.size)
