"""What Cox's partial likelihood with covariates needs of the subjects, in the order of their times."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import ArrayLike

from app.model.values import Floats, Ints
from app.survival.checked import checked_codes, checked_flags, checked_times
from app.survival.time_order import InTimeOrder, Positions, positions_in_order, strata_and_ends

BLOCK = 32_768


@dataclass(frozen=True, eq=False)
class CoxSubjects:
    """Subjects stratum by stratum, times increasing; a column for each time that holds an event.

    covariates : (n, p), less their means, which are `means`, (p,)
    event_rows : (number of events,), the subjects with the event
    starts     : (m,), the first subject of each column, who with all later ones of the stratum is at risk
    n_events   : (m,), events of each column
    time, stratum : (m,), of each column
    strata     : for each stratum that holds an event, its columns and where its subjects end
    """

    covariates: Floats
    means: Floats
    event_rows: Ints
    starts: Ints
    n_events: Ints
    time: Floats
    stratum: Ints
    strata: tuple[tuple[slice, int], ...]
    size: int

    @property
    def n_covariates(self) -> int:
        return int(self.covariates.shape[1])

    @property
    def events(self) -> int:
        return int(self.event_rows.size)

    def first_events(self, columns: slice) -> Ints:
        """The position among `event_rows` of the first event of each of these columns."""
        before = int(self.n_events[: columns.start].sum())
        first: Ints = np.cumsum(self.n_events[columns]) - self.n_events[columns] + before
        return first

    def blocks_from_the_end(self) -> Iterator[CoxBlock]:
        """Columns in blocks that the processor's cache holds, from the last of each stratum to its first."""
        for columns, end in self.strata:
            stratum, upper = slice(int(self.starts[columns.start]), end), end
            for block in reversed(_blocks(self.starts, columns, stratum)):
                rows = slice(int(self.starts[block.start]), upper)
                yield CoxBlock(block, rows, stratum)
                upper = rows.start


@dataclass(frozen=True)
class CoxBlock:
    """Columns, the subjects from the first of them up to the next block's, and all of the stratum."""

    columns: slice
    rows: slice
    stratum: slice

    @property
    def is_last(self) -> bool:
        return bool(self.rows.stop == self.stratum.stop)


def _blocks(starts: Ints, columns: slice, rows: slice) -> list[slice]:
    """The columns of a stratum in blocks of about BLOCK subjects."""
    marks = np.arange(rows.start, rows.stop, BLOCK)
    begins = np.unique(columns.start + np.searchsorted(starts[columns], marks))
    cuts = [*begins[begins < columns.stop].tolist(), columns.stop]
    return [slice(first, last) for first, last in pairwise(cuts)]


def cox_subjects(
    time: ArrayLike, event: ArrayLike, covariates: ArrayLike, stratum: ArrayLike | None
) -> CoxSubjects:
    """Check the arguments of a Cox model and put the subjects in order."""
    times = checked_times(time)
    events = checked_flags(event, "event", times.size)
    columns = checked_covariates(covariates, times.size)
    codes, n_codes = checked_codes(stratum, "stratum", times.size)
    order = positions_in_order(times, codes)
    strata, ends = strata_and_ends(codes, n_codes, times.size)
    ordered = InTimeOrder(times[order], events[order].view(np.uint8), strata, ends)
    starts, run_ends = ordered.runs_with_event()
    event_rows = np.flatnonzero(ordered.outcome.view(np.bool_))
    means = columns.mean(axis=0) if times.size else np.zeros(columns.shape[1])
    per_stratum = np.diff(np.searchsorted(starts, ends), prepend=0)
    return CoxSubjects(
        covariates=np.take(columns, order, axis=0) - means,
        means=means,
        event_rows=event_rows,
        starts=starts.astype(np.int64),
        n_events=_events_between(event_rows, starts, run_ends),
        time=ordered.time[starts],
        stratum=np.repeat(strata, per_stratum),
        strata=_strata_with_events(per_stratum, ends),
        size=times.size,
    )


def _events_between(event_rows: Ints, starts: Positions, ends: Positions) -> Ints:
    if starts.size == event_rows.size:
        return np.ones(starts.size, dtype=np.int64)
    return np.searchsorted(event_rows, ends) - np.searchsorted(event_rows, starts)


def _strata_with_events(per_stratum: Ints, ends: Positions) -> tuple[tuple[slice, int], ...]:
    bounds = np.append(0, np.cumsum(per_stratum)).tolist()
    pairs = zip(pairwise(bounds), ends.tolist(), strict=True)
    return tuple((slice(first, last), end) for (first, last), end in pairs if last > first)


def checked_covariates(covariates: ArrayLike, size: int) -> Floats:
    """Covariates as a float array, shape (size, p), or ValueError; shape (size,) is one covariate."""
    columns = np.asarray(covariates, dtype=np.float64)
    if columns.ndim == 1:
        columns = columns[:, None]
    if columns.ndim != 2 or columns.shape[0] != size or columns.shape[1] == 0:
        raise ValueError(f"covariates has shape {columns.shape}; accepted: ({size}, p), a row as time")
    if not np.isfinite(columns).all():
        raise ValueError(f"covariates holds {columns[~np.isfinite(columns)][0]!r}; accepted: finite numbers")
    return columns
