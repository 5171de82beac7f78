"""Patients of an invented trial: they enter one after the other, have their event, or drop out."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from app.model.values import Bools, Floats, Ints


@dataclass(frozen=True)
class Population:
    """Who is in a trial and what happens to them; times and hazards share one unit.

    Entry is uniform over `accrual`; events and drop-out are exponential. `control_hazards` holds one hazard a
    stratum, the strata being equally likely; the experimental hazard is `hazard_ratio` times the control one.
    `allocation` is control : experimental, and as exact as the number of subjects allows.
    """

    subjects: int
    accrual: float
    control_hazards: tuple[float, ...]
    hazard_ratio: float = 1.0
    dropout_hazard: float = 0.0
    allocation: tuple[int, int] = (1, 1)

    def __post_init__(self) -> None:
        hazards = (*self.control_hazards, self.hazard_ratio)
        if not (self.subjects >= 2 and self.accrual >= 0.0 and min(hazards) > 0.0):
            raise ValueError(f"a population needs subjects, positive hazards and no negative time: {self!r}")
        if not (self.control_hazards and self.dropout_hazard >= 0.0 and min(self.allocation) >= 1):
            raise ValueError(f"a population needs a stratum, two arms and no negative drop-out: {self!r}")

    @property
    def experimental_subjects(self) -> int:
        control, experimental = self.allocation
        return round(self.subjects * experimental / (control + experimental))


@dataclass(frozen=True, eq=False)
class Patients:
    """Many trials at once; arrays of shape (trials, subjects), times from each patient's own entry.

    `event` is the time of the event, infinite where drop-out came first, and `leaves` the time of drop-out.
    """

    entry: Floats
    event: Floats
    leaves: Floats
    experimental: Bools
    stratum: Ints

    @property
    def event_calendar(self) -> Floats:
        """When each event happens, counted from the first possible entry."""
        return self.entry + self.event


def draw_patients(population: Population, trials: int, randomness: np.random.Generator) -> Patients:
    """Patients of `trials` independent trials of one population."""
    shape = (trials, population.subjects)
    arms = np.arange(population.subjects) < population.experimental_subjects
    experimental = randomness.permuted(np.broadcast_to(arms, shape), axis=1)
    stratum = randomness.integers(len(population.control_hazards), size=shape)
    hazard = np.asarray(population.control_hazards)[stratum]
    hazard *= np.where(experimental, population.hazard_ratio, 1.0)
    event = randomness.exponential(size=shape) / hazard
    leaves = np.full(shape, np.inf)
    if population.dropout_hazard > 0.0:
        leaves = randomness.exponential(1.0 / population.dropout_hazard, shape)
    return Patients(
        entry=randomness.uniform(0.0, population.accrual, shape),
        event=np.where(event <= leaves, event, np.inf),
        leaves=leaves,
        experimental=experimental,
        stratum=stratum,
    )
