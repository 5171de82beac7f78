"""A small invented trial, the same at every run: its plan, its extracts at any cutoff, its samples.

Nobody was treated. Entry is uniform over 400 days, times are exponential from a fixed seed; the arms' values
are words that stand nowhere else, so that a text that names an arm is found by searching for them.
"""

from __future__ import annotations

import csv
import io
from dataclasses import dataclass, replace
from datetime import date, timedelta

import numpy as np

from app.intake.extract import received_file
from app.intake.plan import read_plan
from app.model.extract import ReceivedFile, Sample
from app.model.plan import Plan
from app.model.values import Bools, Floats, Ints, read_only
from app.settings import Limits

CONTROL, EXPERIMENTAL = "SYRUPINE", "PELLETOL"
FIRST_DAY = date(2024, 1, 8)
EPOCH = date(1970, 1, 1)
REGIONS = ("North", "South")
DESCRIBED = {"RELAPSE": "Time to relapse (days)", "DEATH": "Time to death (days)"}
COLUMNS = (
    "STUDYID",
    "USUBJID",
    "TRTP",
    "PARAMCD",
    "PARAM",
    "AVAL",
    "CNSR",
    "STARTDT",
    "ADT",
    "REGION",
    "SEX",
)

PLAN = """
format = 1
[trial]
name = "K4"
title = "An invented trial of two drugs"
[arms]
control = "SYRUPINE"
experimental = "PELLETOL"
allocation = [1, 1]
masked = true
[endpoint]
parameter = "RELAPSE"
label = "Relapse"
event_is = "bad"
[columns]
strata = ["REGION"]
[design]
alpha = 0.025
sides = 1
power = 0.8
hazard_ratio = 0.5
planned_events = 80
looks = [0.25, 0.5, 0.75, 1.0]
[efficacy]
spending = "O'Brien-Fleming-type"
[enrolment]
planned_subjects = 160
"""


HARM_ON_DEATH = """
[harm]
spending = "Pocock-type"
alpha = 0.025
parameter = "DEATH"
"""
DEATH_AFTER_RELAPSE = """
[[hypothesis]]
name = "Death"
parameter = "DEATH"
label = "Death from any cause"
event_is = "bad"
after = "primary"
alpha = 0.025
planned_events = 60
efficacy = {spending = "Pocock-type"}
"""


def held_before(
    *zs: float, events: tuple[int, ...] = (10, 20), source: str = "Charter table 2"
) -> tuple[str, str]:
    """A change of the plan that enters looks with these z's as held before, with rounded bounds."""
    used = zip(zs, events, (5.0, 4.33), (0.0000003, 0.00001), strict=False)
    tables = [
        f"[[held]]\nnumber = {number}\nevents = {count}\nz = {z}\n"
        f'efficacy_z = {bound}\nalpha_spent = {spent}\nsource = "{source}"\n'
        for number, (z, count, bound, spent) in enumerate(used, 1)
    ]
    return "[efficacy]\n", f"{''.join(tables)}[efficacy]\n"


def plan_text(*changes: tuple[str, str], of: str = PLAN) -> bytes:
    """The plan's bytes, each (old, new) exchanged; an old text that is not there is a bug of the test."""
    for old, new in changes:
        assert old in of, old
        of = of.replace(old, new)
    return of.encode()


def plan(*changes: tuple[str, str]) -> Plan:
    return read_plan(plan_text(*changes), name="plan.toml", limits=Limits())


@dataclass(frozen=True, eq=False)
class Patients:
    """Everybody who will ever enter: day of entry from FIRST_DAY on, days to the event, arm, region."""

    entry: Ints
    time: Floats
    dropout: Floats
    experimental: Bools
    region: Ints

    def with_arms_exchanged(self) -> Patients:
        return replace(self, experimental=~self.experimental)

    def at(self, cutoff: date) -> Seen:
        """Who had entered by this day, and what was known of them."""
        days = (cutoff - FIRST_DAY).days
        here = np.flatnonzero(self.entry <= days)
        followed = (days - self.entry[here] + 1).astype(np.float64)
        ends = np.minimum(followed, self.dropout[here])
        event = self.time[here] <= ends
        time = np.where(event, self.time[here], ends)
        return Seen(here, time, event, self.experimental[here], self.region[here], self.entry[here])


@dataclass(frozen=True, eq=False)
class Seen:
    subject: Ints
    time: Floats
    event: Bools
    experimental: Bools
    region: Ints
    entry: Ints

    def sample(self, time_unit: str = "days") -> Sample:
        start = self.entry + (FIRST_DAY - EPOCH).days
        return Sample(
            parameter="RELAPSE",
            subject=tuple(f"K4-{number:04d}" for number in self.subject),
            time=read_only(self.time, np.float64),
            event=read_only(self.event, np.bool_),
            experimental=read_only(self.experimental, np.bool_),
            stratum=read_only(self.region, np.int64),
            stratum_labels=REGIONS,
            time_unit=time_unit,  # type: ignore[arg-type]
            start_day=read_only(start, np.int64),
            end_day=read_only(start + self.time.astype(np.int64) - 1, np.int64),
        )

    def csv(self, parameter: str = "RELAPSE", *, head: bool = True) -> bytes:
        """The extract as the data centre would write it, with a column that nobody needs."""
        text = io.StringIO()
        rows = csv.writer(text, lineterminator="\n")
        if head:
            rows.writerow(COLUMNS)
        for at in range(self.subject.size):
            start = FIRST_DAY + timedelta(days=int(self.entry[at]))
            end = start + timedelta(days=int(self.time[at]) - 1)
            rows.writerow(
                [
                    "K4", f"K4-{self.subject[at]:04d}",
                    EXPERIMENTAL if self.experimental[at] else CONTROL, parameter, DESCRIBED[parameter],
                    int(self.time[at]), int(not self.event[at]), start, end, REGIONS[self.region[at]], "F",
                ]
            )  # fmt: skip
        return text.getvalue().encode()


def patients(seed: int = 4, size: int = 160, hazard_ratio: float = 0.5, median: float = 300.0) -> Patients:
    draw = np.random.default_rng(seed)
    experimental = draw.permutation(np.arange(size) % 2 == 0)
    region = draw.integers(0, 2, size)
    rate = np.log(2) / median * np.where(experimental, hazard_ratio, 1.0)
    return Patients(
        entry=np.sort(draw.integers(0, 400, size)),
        time=np.ceil(draw.exponential(1 / rate)),
        dropout=np.ceil(draw.exponential(2500, size)),
        experimental=experimental,
        region=region,
    )


def with_deaths(people: Patients, seed: int = 9) -> Patients:
    """The same people, their deaths some time after their relapses."""
    later = np.ceil(np.random.default_rng(seed).exponential(250.0, people.time.size))
    return replace(people, time=people.time + later)


CUTOFFS = (date(2024, 12, 1), date(2025, 4, 20), date(2025, 11, 1), date(2027, 1, 1))
"""When the looks are held; at these the trial of seed 4 has the events that `look_events` says."""


def two_endpoints(people: Patients, cutoff: date) -> bytes:
    """An extract with a row of RELAPSE and a row of DEATH for each subject."""
    deaths = with_deaths(people).at(cutoff).csv("DEATH", head=False)
    return people.at(cutoff).csv() + deaths


def extract(cutoff: date, people: Patients | None = None, name: str = "adtte.csv") -> ReceivedFile:
    return received_file(name, (people or patients()).at(cutoff).csv())
