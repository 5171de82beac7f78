"""Who was at risk and what happened to them: the counts that every estimator here starts from."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import ArrayLike, NDArray

from app.model.values import Bools, Floats, Ints

CELLS_PER_SUBJECT = 4  # days are counted rather than sorted while the grid of days stays this small
FEWEST_CELLS = 4096


@dataclass(frozen=True, eq=False)
class RiskTable:
    """A column per distinct time of each stratum, shape (m,): stratum by stratum, times increasing.

    Counts have shape (groups, m), row g for group g. `at_risk` counts subjects just before the time:
    events at a time precede censorings at it, so subjects censored there are still at risk there.
    """

    time: Floats
    stratum: Ints
    at_risk: Ints
    events: Ints
    censored: Ints

    def only(self, columns: slice | Ints) -> RiskTable:
        """The table of these columns alone; counts at risk stay as they are."""
        return RiskTable(
            self.time[columns],
            self.stratum[columns],
            self.at_risk[:, columns],
            self.events[:, columns],
            self.censored[:, columns],
        )

    def with_events(self) -> RiskTable:
        """Only the times at which an event fell."""
        return self.only(np.flatnonzero(self.events.any(axis=0)))

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
    times = checked_times(time)
    events = checked_flags(event, "event", times.size)
    groups, n_groups = checked_codes(group, "group", times.size)
    strata, n_strata = checked_codes(stratum, "stratum", times.size)
    outcome = events.astype(np.int64) if groups is None else events + 2 * groups
    days = whole_days(times, n_strata)
    if days is None:
        return _by_sorting(times, outcome, n_groups, strata)
    return _by_counting(days, outcome, n_groups, strata, n_strata)


def checked_times(time: ArrayLike) -> Floats:
    """`time` as a float array, shape (n,), or ValueError."""
    times = np.asarray(time, dtype=np.float64)
    if times.ndim != 1:
        raise ValueError(f"time has shape {times.shape}; accepted: (n,)")
    # written so that NaN, which fails every comparison, is refused too
    if times.size and not (times.min() >= 0 and times.max() < np.inf):
        wrong = times[~((times >= 0) & (times < np.inf))]
        raise ValueError(f"time holds {wrong[0]!r}; accepted: finite numbers >= 0")
    return times


def checked_flags(flags: ArrayLike, name: str, size: int) -> Bools:
    """`flags` as a bool array, shape (size,), or ValueError; 0 and 1 are taken as False and True."""
    values = np.asarray(flags)
    if values.shape != (size,):
        raise ValueError(f"{name} has shape {values.shape}; accepted: ({size},), as time")
    if values.dtype == np.bool_:
        return values
    wrong = values[(values != 0) & (values != 1)]
    if wrong.size:
        raise ValueError(f"{name} holds {wrong[0]!r}; accepted: True or False")
    return values.astype(np.bool_)


def checked_codes(codes: ArrayLike | None, name: str, size: int) -> tuple[Ints | None, int]:
    """Group or stratum codes as integers, shape (size,), with how many codes there are, or ValueError."""
    if codes is None:
        return None, 1
    values = np.asarray(codes)
    if values.shape != (size,):
        raise ValueError(f"{name} has shape {values.shape}; accepted: ({size},), as time")
    if values.dtype == np.bool_:
        return values.astype(np.int64), 2
    if size == 0:
        return None, 1
    if not np.issubdtype(values.dtype, np.integer) or values.min() < 0:
        raise ValueError(f"{name} holds {values.min()!r}; accepted: integer codes from 0")
    return values.astype(np.int64, copy=False), int(values.max()) + 1


def whole_days(times: Floats, n_strata: int) -> Ints | None:
    """The times as integers, when all are whole and counting them is cheaper than sorting; else None."""
    most = max(CELLS_PER_SUBJECT * times.size, FEWEST_CELLS)
    if times.size == 0 or (times.max() + 1) * n_strata > most:
        return None
    days = times.astype(np.int64)
    return days if np.array_equal(days, times) else None


def first_of_runs(*keys: NDArray[np.generic]) -> Ints:
    """Where a new run of equal values begins, in arrays of one shape (n,) that lie in order."""
    if keys[0].size == 0:
        return np.empty(0, dtype=np.int64)
    changed = np.zeros(keys[0].size, dtype=np.bool_)
    changed[0] = True
    for key in keys:
        changed[1:] |= key[1:] != key[:-1]
    return np.flatnonzero(changed)


def _by_counting(days: Ints, outcome: Ints, n_groups: int, stratum: Ints | None, n_strata: int) -> RiskTable:
    """One count of (outcome, stratum, day) cells; no sort."""
    width = int(days.max()) + 1
    column = days if stratum is None else stratum * width + days
    leaving = _count(outcome, column, n_groups, n_strata * width)
    seen = np.flatnonzero(leaving.any(axis=(0, 1)))
    stratum_of, day_of = np.divmod(seen, width)
    return _table(day_of.astype(np.float64), stratum_of, leaving[:, :, seen])


def _by_sorting(times: Floats, outcome: Ints, n_groups: int, stratum: Ints | None) -> RiskTable:
    """One sort by time, and a stable one by stratum where there are strata."""
    order = np.argsort(times)
    if stratum is None:
        stratum = np.zeros(times.size, dtype=np.int64)
    else:
        order = order[np.argsort(stratum[order], kind="stable")]
    times, stratum = times[order], stratum[order]
    starts = first_of_runs(times, stratum)
    column = np.repeat(np.arange(starts.size), np.diff(starts, append=times.size))
    leaving = _count(outcome[order], column, n_groups, starts.size)
    return _table(times[starts], stratum[starts], leaving)


def _count(outcome: Ints, column: Ints, n_groups: int, width: int) -> Ints:
    """How many left at each column, shape (groups, 2, width): censored, then with an event."""
    cells = 2 * n_groups * width
    return np.bincount(outcome * width + column, minlength=cells).reshape(n_groups, 2, width)


def _table(time: Floats, stratum: Ints, leaving: Ints) -> RiskTable:
    """At risk at a column = all who leave at it or later in its stratum."""
    left = np.cumsum(leaving.sum(axis=1), axis=1)
    starts = first_of_runs(stratum)
    ends = np.append(starts[1:], time.size) - 1 if starts.size else starts
    left_at_end = np.repeat(left[:, ends], np.diff(starts, append=time.size), axis=1)
    at_risk = left_at_end - left + leaving.sum(axis=1)
    return RiskTable(time, stratum, at_risk, events=leaving[:, 1], censored=leaving[:, 0])
