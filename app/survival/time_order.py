"""Subjects in the order of their times, found by one sort.

A time is a double >= 0, and the bit patterns of such doubles, read as integers, stand in the order of the
doubles. The times of one trial differ in their lower bits only (55 of 64 for a range of 1 to 250), so that
the stratum fits above them and the outcome below: sorting these 64-bit keys carries both along, with nothing
left to gather. Where they do not fit, positions are sorted instead.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from app.model.values import Bools, Counts, Floats, Ints

KEY_BITS = 64
SMALL_DAYS = 2**15  # whole days below it are sorted as 16-bit integers, byte by byte

Outcomes = NDArray[np.unsignedinteger[Any]]
"""event + 2 * group of each subject, in the smallest type that holds them."""

Positions = NDArray[np.int32]
"""Positions among the subjects, and counts up to them; no trial has 2^31 subjects."""


@dataclass(frozen=True, eq=False)
class InTimeOrder:
    """One entry per subject, shape (n,): stratum by stratum, times increasing within each.

    `strata` are the codes of the strata that hold a subject, shape (s,), and `ends` where each ends.
    """

    time: Floats
    outcome: Outcomes
    strata: Ints
    ends: Positions

    def runs(self) -> tuple[Positions, Positions]:
        """Where each run of subjects who share a time and a stratum starts, and where it ends."""
        starts_run = self._starts_run()
        if starts_run.all():
            bounds = np.arange(self.time.size + 1, dtype=np.int32)
        else:
            bounds = np.append(np.flatnonzero(starts_run), self.time.size).astype(np.int32)
        return bounds[:-1], bounds[1:]

    def runs_with_event(self) -> tuple[Positions, Positions]:
        """The runs that hold an event."""
        with_event = np.flatnonzero(self.outcome & 1 != 0).astype(np.int32)
        if self._starts_run().all():  # nobody shares a time: each event is a run
            return with_event, with_event + np.int32(1)
        starts, ends = self.runs()
        first_event = np.searchsorted(with_event, starts)
        holding = np.flatnonzero(np.append(with_event, self.time.size)[first_event] < ends)
        return starts[holding], ends[holding]

    def _starts_run(self) -> Bools:
        is_first = np.empty(self.time.size, dtype=np.bool_)
        is_first[:1] = True
        np.not_equal(self.time[1:], self.time[:-1], out=is_first[1:])
        is_first[self.ends[:-1]] = True
        return is_first


def values_at(positions: Counts, values: NDArray[Any]) -> NDArray[Any]:
    """The values, shape (n,), at increasing positions; where these are all positions, nothing is gathered."""
    return values if positions.size == values.size else values[positions]


def in_time_order(time: Floats, outcome: Outcomes, stratum: Counts | None, n_strata: int) -> InTimeOrder:
    """Put subjects in order; all arrays of shape (n,), codes below `n_strata` or one stratum of all."""
    by_keys = _by_packed_keys(time, outcome, stratum, n_strata)
    if by_keys is not None:
        return by_keys
    order = positions_in_order(time, stratum)
    return InTimeOrder(time[order], outcome[order], *strata_and_ends(stratum, n_strata, time.size))


def strata_and_ends(stratum: Counts | None, n_strata: int, size: int) -> tuple[Ints, Positions]:
    """The codes of the strata that hold a subject, and where each ends once subjects are in order."""
    if stratum is None:
        return np.zeros(min(1, size), dtype=np.int64), np.full(min(1, size), size, dtype=np.int32)
    return _with_subjects(np.bincount(stratum, minlength=n_strata))


def _with_subjects(sizes: Ints) -> tuple[Ints, Positions]:
    """The strata of a size above 0, and where each ends."""
    strata = np.flatnonzero(sizes)
    return strata, np.cumsum(sizes[strata], dtype=np.int32)


def positions_in_order(time: Floats, stratum: Counts | None) -> Ints:
    """The positions of the subjects by stratum, then time: one sort, and a stable one by stratum."""
    if time.size and time[0] % 1.0 == 0.0 and time.max() < SMALL_DAYS and not np.any(time % 1.0):
        order = np.argsort(time.astype(np.int16), kind="stable")
    else:
        order = np.argsort(time)
    return order if stratum is None else order[np.argsort(stratum[order], kind="stable")]


def _by_packed_keys(
    time: Floats, outcome: Outcomes, stratum: Counts | None, n_strata: int
) -> InTimeOrder | None:
    """Sort [stratum | time | outcome] as integers; None where they need more than 64 bits."""
    if time.size == 0:
        return None
    time = np.abs(time)  # -0.0, which equals 0.0, has another bit pattern
    patterns = time.view(np.uint64)
    lowest = int(time.min().view(np.uint64))
    time_bits = (int(time.max().view(np.uint64)) - lowest).bit_length()
    outcome_bits = int(outcome.max()).bit_length()
    stratum_bits = (n_strata - 1).bit_length()
    if time_bits + outcome_bits + stratum_bits > KEY_BITS:
        return None
    keys = np.subtract(patterns, np.uint64(lowest), out=patterns)
    if stratum is not None:
        above = stratum.astype(np.uint64)
        above <<= np.uint64(time_bits)
        keys |= above
    keys <<= np.uint64(outcome_bits)
    keys |= outcome
    keys.sort()
    sorted_outcome = keys.astype(outcome.dtype)  # keeps the lower bits
    sorted_outcome &= (1 << outcome_bits) - 1
    keys >>= np.uint64(outcome_bits)
    if stratum is None:
        strata, ends = strata_and_ends(None, 1, keys.size)
    else:  # the sorted keys tell where each stratum starts, without a count
        starts = np.searchsorted(keys, np.arange(n_strata, dtype=np.uint64) << np.uint64(time_bits))
        strata, ends = _with_subjects(np.diff(starts, append=keys.size))
        keys &= np.uint64((1 << time_bits) - 1)
    keys += np.uint64(lowest)
    return InTimeOrder(keys.view(np.float64), sorted_outcome, strata, ends)
