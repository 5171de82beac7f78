"""Who was at risk and what happened to them: the counts that every estimator here starts from."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from app.model.values import Bools, Counts, Floats, Ints
from app.survival.checked import checked_codes, checked_flags, checked_times
from app.survival.time_order import InTimeOrder, Outcomes, Positions, in_time_order, values_at

CELLS_PER_SUBJECT = 2  # days are counted rather than sorted while the grid of days stays this small
FEWEST_CELLS = 4096


@dataclass(frozen=True, eq=False)
class EventTable:
    """A column per time with an event, of each stratum, shape (m,): stratum by stratum, times increasing.

    Counts have shape (groups, m), row g for group g; `at_risk` as in `RiskTable`. `strata` are the codes of
    the strata that hold a subject, shape (s,), in order, and `subjects` their subjects, shape (groups, s).
    """

    time: Floats
    stratum: Counts
    at_risk: Counts
    events: Counts
    strata: Ints
    subjects: Counts

    def at_events(self) -> EventTable:
        """Itself: see `RiskTable.at_events`."""
        return self

    def only(self, columns: slice | Ints | Bools) -> EventTable:
        """The table of these columns alone; counts at risk and subjects stay as they are."""
        return EventTable(
            self.time[columns],
            self.stratum[columns],
            self.at_risk[:, columns],
            self.events[:, columns],
            self.strata,
            self.subjects,
        )

    def spans(self) -> Iterator[slice]:
        """The columns of each stratum, in the order of `strata`; none where no event fell."""
        ends = np.searchsorted(self.stratum, self.strata, side="right")
        return (slice(start, end) for start, end in pairwise([0, *ends.tolist()]))

    @cached_property
    def at_risk_in_all(self) -> Floats:
        """At risk in all groups together, shape (m,)."""
        return sum_of_rows(self.at_risk)

    @cached_property
    def events_in_all(self) -> Floats:
        """Events in all groups together, shape (m,)."""
        return sum_of_rows(self.events)


@dataclass(frozen=True, eq=False)
class RiskTable:
    """A column per distinct time of each stratum, shape (m,): stratum by stratum, times increasing.

    Counts have shape (groups, m), row g for group g. `at_risk` counts subjects just before the time:
    events at a time precede censorings at it, so subjects censored there are still at risk there.
    """

    time: Floats
    stratum: Counts
    at_risk: Counts
    events: Counts
    censored: Counts

    def only(self, columns: slice | Ints) -> RiskTable:
        """The table of these columns alone; counts at risk stay as they are."""
        return RiskTable(
            self.time[columns],
            self.stratum[columns],
            self.at_risk[:, columns],
            self.events[:, columns],
            self.censored[:, columns],
        )

    def at_events(self) -> EventTable:
        """Only the times at which an event fell."""
        with_event = np.flatnonzero(self.events.any(axis=0))
        starts = first_of_runs(self.stratum)
        return EventTable(
            self.time[with_event],
            self.stratum[with_event],
            self.at_risk.take(with_event, axis=1),  # quicker than the same by brackets
            self.events.take(with_event, axis=1),
            strata=self.stratum[starts],
            subjects=self.at_risk.take(starts, axis=1),
        )

    def strata(self) -> Iterator[RiskTable]:
        """One table for each stratum that holds a subject, in the order of their codes."""
        for start, end in pairwise([*first_of_runs(self.stratum), self.time.size]):
            yield self.only(slice(start, end))

    @property
    def subjects(self) -> int:
        """Everybody in the table: each subject leaves at exactly one time."""
        return int(self.events.sum() + self.censored.sum())


def risk_table(
    time: ArrayLike, event: ArrayLike, group: ArrayLike | None = None, stratum: ArrayLike | None = None
) -> RiskTable:
    """Count those at risk, the events and the censorings at each distinct time of each stratum.

    Parameters
    ----------
    time : float array, shape (n,), finite, >= 0, in any one unit
    event : bool array, shape (n,); True = event at `time`, False = censored there
    group : int array, shape (n,), codes from 0, optional; default is one group
    stratum : int array, shape (n,), codes from 0, optional; default is one stratum

    Returns
    -------
    RiskTable
        with one row of counts for each code up to the largest in `group`, and two at least when
        `group` is boolean.

    Raises
    ------
    ValueError : an argument breaks a domain above - a bug in the caller.

    Notes
    -----
    *Convention*: at one time events precede censorings; times are tied when they are equal as numbers
    (`merge_near_ties` first, for times that were not counted in whole days).
    *Accuracy*: exact, counts are integers. Whole days are counted without sorting; other times are sorted
    once.
    *Checked*: by hand (tests/byhand), against a literal count (tests/naive.py), properties.

    Examples
    --------
    >>> table = risk_table([3, 1, 3], [True, True, False])
    >>> table.time.tolist(), table.at_risk.tolist(), table.events.tolist()
    ([1.0, 3.0], [[3, 2]], [[1, 1]])
    """
    subjects = _subjects(time, event, group, stratum)
    days = whole_days(subjects.time, subjects.n_strata)
    return _by_sorting(subjects) if days is None else _DayGrid.of(subjects, days).risk_table()


def event_table(
    time: ArrayLike, event: ArrayLike, group: ArrayLike | None = None, stratum: ArrayLike | None = None
) -> EventTable:
    """`risk_table(...).at_events()` without making the columns that hold censorings only; domains as there.

    Examples
    --------
    >>> table = event_table([3, 1, 2], [True, True, False])
    >>> table.time.tolist(), table.at_risk.tolist(), table.subjects.tolist()
    ([1.0, 3.0], [[3, 1]], [[3]])
    """
    subjects = _subjects(time, event, group, stratum)
    days = whole_days(subjects.time, subjects.n_strata)
    return _events_by_sorting(subjects) if days is None else _DayGrid.of(subjects, days).event_table()


def sum_of_rows(counts: Counts) -> Floats:
    """The counts of all groups together, shape (m,); row upon row, which is faster than down the columns."""
    total: Floats = counts[0].astype(np.float64)
    for row in counts[1:]:
        total += row
    return total


def whole_days(times: Floats, n_strata: int) -> Ints | None:
    """The times as integers, when all are whole and counting them is cheaper than sorting; else None."""
    most = max(CELLS_PER_SUBJECT * times.size, FEWEST_CELLS)
    if times.size == 0 or times[0] % 1.0 or (times.max() + 1) * n_strata > most:
        return None
    days = times.astype(np.int64)
    return days if np.array_equal(days, times) else None


def first_of_runs(key: NDArray[np.generic]) -> Ints:
    """Where a new run of equal values begins, in an array of shape (n,)."""
    is_first = np.ones(key.size, dtype=np.bool_)
    np.not_equal(key[1:], key[:-1], out=is_first[1:])
    return np.flatnonzero(is_first)


@dataclass(frozen=True, eq=False)
class _Subjects:
    """Checked arguments: one entry per subject, shape (n,). `outcome` is event + 2 * group."""

    time: Floats
    outcome: Outcomes
    n_groups: int
    stratum: Counts | None
    n_strata: int


def _subjects(
    time: ArrayLike, event: ArrayLike, group: ArrayLike | None, stratum: ArrayLike | None
) -> _Subjects:
    times = checked_times(time)
    events = checked_flags(event, "event", times.size)
    groups, n_groups = checked_codes(group, "group", times.size)
    strata, n_strata = checked_codes(stratum, "stratum", times.size)
    outcome = events.astype(np.min_scalar_type(2 * n_groups))
    if groups is not None:
        outcome |= groups.astype(outcome.dtype) << 1
    return _Subjects(times, outcome, n_groups, strata, n_strata)


@dataclass(frozen=True, eq=False)
class _DayGrid:
    """A cell for every day of every stratum, whether anybody leaves then or not: counts without a sort.

    Counts have shape (groups, strata * days), the days of one stratum after those of another.
    """

    events: Ints
    censored: Ints
    days: int

    @classmethod
    def of(cls, subjects: _Subjects, days: Ints) -> _DayGrid:
        """One count of (outcome, stratum, day)."""
        wide = int(days.max()) + 1
        cells = subjects.n_strata * wide
        cell = subjects.outcome * np.int64(cells)
        cell += days
        if subjects.stratum is not None:
            cell += subjects.stratum * np.int64(wide)
        leaving = np.bincount(cell, minlength=2 * subjects.n_groups * cells)
        leaving = leaving.reshape(subjects.n_groups, 2, cells)
        return cls(events=leaving[:, 1], censored=leaving[:, 0], days=wide)

    def risk_table(self) -> RiskTable:
        """A column for each cell in which somebody leaves."""
        columns = np.flatnonzero(self.events.any(axis=0) | self.censored.any(axis=0))
        return RiskTable(
            *self._time_and_stratum(columns),
            self._at_risk().take(columns, axis=1),
            events=self.events.take(columns, axis=1),
            censored=self.censored.take(columns, axis=1),
        )

    def event_table(self) -> EventTable:
        """A column for each cell with an event."""
        columns, at_risk = np.flatnonzero(self.events.any(axis=0)), self._at_risk()
        subjects = at_risk[:, :: self.days]  # on the first day everybody is at risk
        strata = np.flatnonzero(subjects.any(axis=0))
        return EventTable(
            *self._time_and_stratum(columns),
            at_risk.take(columns, axis=1),
            self.events.take(columns, axis=1),
            strata=strata,
            subjects=subjects.take(strata, axis=1),
        )

    def _time_and_stratum(self, columns: Ints) -> tuple[Floats, Ints]:
        stratum, day = np.divmod(columns, self.days)
        return day.astype(np.float64), stratum

    def _at_risk(self) -> Ints:
        """At risk in a cell = all who leave in it or later in its stratum."""
        groups = self.events.shape[0]
        left: Ints = (self.events + self.censored).reshape(groups, -1, self.days)
        np.cumsum(left[..., ::-1], axis=-1, out=left[..., ::-1])
        return left.reshape(groups, -1)


def _by_sorting(subjects: _Subjects) -> RiskTable:
    """One sort; then a column for each run of subjects who share time and stratum."""
    ordered = in_time_order(subjects.time, subjects.outcome, subjects.stratum, subjects.n_strata)
    counts = _Counts.of(ordered, subjects.n_groups)
    starts, ends = ordered.runs()
    events = counts.events(starts, ends)
    return RiskTable(
        time=values_at(starts, ordered.time),
        stratum=counts.at_each(starts, ordered.strata),
        at_risk=counts.at_risk(starts),
        events=events,
        censored=counts.leaving(starts, ends) - events,
    )


def _events_by_sorting(subjects: _Subjects) -> EventTable:
    """The same, but only of runs that hold an event."""
    ordered = in_time_order(subjects.time, subjects.outcome, subjects.stratum, subjects.n_strata)
    starts, ends = ordered.runs_with_event()
    counts = _Counts.of(ordered, subjects.n_groups)
    return EventTable(
        time=values_at(starts, ordered.time),
        stratum=counts.at_each(starts, ordered.strata),
        at_risk=counts.at_risk(starts),
        events=counts.events(starts, ends),
        strata=ordered.strata,
        subjects=counts.leaving(np.append(np.int32(0), ordered.ends)[:-1], ordered.ends),
    )


@dataclass(frozen=True, eq=False)
class _Counts:
    """Counts between positions of subjects in order.

    `in_group` says how many of each group but the last, which has the rest, come before each position; each
    of shape (n + 1,).
    """

    outcome: Outcomes
    ends: Positions
    in_group: tuple[Positions, ...]

    @classmethod
    def of(cls, ordered: InTimeOrder, n_groups: int) -> _Counts:
        others = range(n_groups - 1)
        return cls(
            ordered.outcome, ordered.ends, tuple(_running(ordered.outcome >> 1 == group) for group in others)
        )

    def leaving(self, starts: Counts, ends: Counts) -> Counts:
        """Who leave between the positions, shape (groups, m)."""
        return _with_last_group(ends - starts, [count[ends] - count[starts] for count in self.in_group])

    def events(self, starts: Counts, ends: Counts) -> Counts:
        """Who leave with the event between the positions, shape (groups, m)."""
        by_group = [self.outcome == 2 * group + 1 for group in range(len(self.in_group))]
        flags = [self.outcome & 1 != 0, *by_group]
        if (ends - starts).max(initial=1) == 1:
            total, *others = (values_at(starts, flag) for flag in flags)
        else:
            total, *others = (_running(flag)[ends] - _running(flag)[starts] for flag in flags)
        return _with_last_group(total, others)

    def at_risk(self, starts: Counts) -> Counts:
        """Who leave at the positions or later in their stratum, shape (groups, m)."""
        total = self.at_each(starts, self.ends) - starts
        return _with_last_group(
            total, [self.at_each(starts, count[self.ends]) - count[starts] for count in self.in_group]
        )

    def at_each(self, starts: Counts, of_stratum: NDArray[Any]) -> NDArray[Any]:
        """The value of its stratum at each position, shape (m,)."""
        if of_stratum.size == 1:
            return np.broadcast_to(of_stratum, starts.shape)
        return np.repeat(of_stratum, np.diff(np.searchsorted(starts, self.ends), prepend=0))


def _running(flags: NDArray[Any]) -> Positions:
    running = np.zeros(flags.size + 1, dtype=np.int32)
    np.cumsum(flags, dtype=np.int32, out=running[1:])
    return running


def _with_last_group(total: NDArray[Any], others: list[NDArray[Any]]) -> Counts:
    """A row for each group, of which the last has what the others leave of the total."""
    rows = np.empty((len(others) + 1, total.size), dtype=np.int32)
    rows[-1] = total
    for row, count in zip(rows, others, strict=False):
        row[:] = count
        rows[-1] -= row
    return rows
