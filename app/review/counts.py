"""Denominators: subjects, events, person-time, by arm, stratum and calendar day."""

from __future__ import annotations

from collections.abc import Callable
from typing import TypeVar

import numpy as np

from app.errors import NotEstimable
from app.model.extract import PooledSample, Sample
from app.model.look import ArmCounts, CalendarCounts, StratumCounts
from app.model.values import Absent, Bools, Floats, Ints, read_only
from app.survival import follow_up_median, merge_near_ties

T = TypeVar("T")


def or_reason(estimate: Callable[[], T]) -> T | Absent:
    """The estimate, or the reason the data cannot give one."""
    try:
        return estimate()
    except NotEstimable as reason:
        return Absent(reason.what)


def times_of(sample: Sample | PooledSample) -> Floats:
    """Whole days as they are; times given in another unit with near-ties merged (DESIGN: estimators)."""
    return sample.time if sample.time_unit == "days" else merge_near_ties(sample.time)


def arm_counts(time: Floats, event: Bools) -> ArmCounts:
    return ArmCounts(
        subjects=int(time.size),
        events=int(event.sum()),
        person_time=float(time.sum()),
        follow_up_median=follow_up_median(time, event),
    )


def strata_counts(sample: Sample) -> tuple[StratumCounts, ...]:
    size = len(sample.stratum_labels)
    by_arm = np.zeros((2, 2, size), dtype=np.int64)  # [experimental, event, stratum]
    np.add.at(by_arm, (sample.experimental.astype(int), sample.event.astype(int), sample.stratum), 1)
    return tuple(
        StratumCounts(
            label=label,
            subjects=int(by_arm[:, :, index].sum()),
            events=int(by_arm[:, 1, index].sum()),
            experimental_subjects=int(by_arm[1, :, index].sum()),
            experimental_events=int(by_arm[1, 1, index]),
        )
        for index, label in enumerate(sample.stratum_labels)
    )


def pooled_strata(sample: PooledSample) -> tuple[tuple[str, int, int], ...]:
    size = len(sample.stratum_labels)
    subjects = np.bincount(sample.stratum, minlength=size)
    events = np.bincount(sample.stratum[sample.event], minlength=size)
    return tuple(zip(sample.stratum_labels, subjects.tolist(), events.tolist(), strict=True))


def calendar_counts(sample: Sample | PooledSample) -> CalendarCounts | None:
    """Cumulative subjects and events, both arms, on every day on which either grew; None without dates."""
    if sample.start_day is None or sample.end_day is None:
        return None
    ends: Ints = np.sort(sample.end_day[sample.event])
    starts: Ints = np.sort(sample.start_day)
    day = np.unique(np.concatenate([starts, ends]))
    return CalendarCounts(
        day=read_only(day, np.int64),
        randomised=read_only(np.searchsorted(starts, day, side="right"), np.int64),
        events=read_only(np.searchsorted(ends, day, side="right"), np.int64),
    )
