"""The log-rank test by permutation of the arms, for trials with few events."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from itertools import combinations, product
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike

from app.errors import NotEstimable
from app.model.survival import PermutationResult
from app.model.values import Bools, Floats, Ints
from app.survival.checked import checked_choice, checked_codes, checked_flags, checked_times
from app.survival.comparison import Direction, logrank
from app.survival.curve import product_limit
from app.survival.risk_table import risk_table

MOST_LISTED = 20_000
SAME = 1e-9  # scores this near, relative to their spread, are the same: sums in another order

FollowUp = Literal["equal", "unequal"]


def permutation_logrank(
    time: ArrayLike,
    event: ArrayLike,
    experimental: ArrayLike,
    *,
    random: np.random.Generator,
    stratum: ArrayLike | None = None,
    direction: Direction = 1,
    follow_up: FollowUp = "equal",
    permutations: int = 9_999,
) -> PermutationResult:
    """The p-value of the log-rank score among those of other allocations of the same subjects to the arms.

    Parameters
    ----------
    time, event, experimental, stratum, direction : as in `logrank`
    random : a generator that the caller has seeded
    follow_up : "equal" when censoring does not depend on the arm; "unequal" when one arm is followed longer
    permutations : how many allocations are drawn, at least 1

    Returns
    -------
    PermutationResult
        p-values, their Monte Carlo standard errors, how many allocations were seen, whether these were all.

    Raises
    ------
    ValueError : an argument breaks a domain - a bug in the caller.
    NotEstimable : no event tells the arms apart.

    Notes
    -----
    *Convention*: arms are exchanged within strata, with the numbers in the arms kept. Equal follow-up: every
    subject keeps time and outcome, and the statistic is O - E with the scores of both arms together; at most
    20,000 allocations are all listed, which makes the p-values exact. Unequal follow-up: each time, a
    censored subject's event time is drawn from the pooled curve beyond the censoring, an unseen censoring
    time from the arm's own censoring curve beyond the event, and event times are exchanged while arm and
    censoring time stay; the statistic is z. Drawn p-values count the allocation observed as one: (1 + as
    extreme) / (1 + drawn). *Accuracy*: the Monte Carlo standard error sqrt(p (1 - p) / drawn) is part of the
    result; 0 when all listed. *Checked*: by full enumeration of small trials (tests/unit/survival), by its
    level under no difference.

    References
    ----------
    Kellerer & Chmelevsky (1983), Biometrics 39, 675-682. Heinze, Gnant & Schemper (2003), Biometrics 59,
    1151-1157. Wang, Lagakos & Gray (2010), Biostatistics 11, 676-692.
    """
    times = checked_times(time)
    events = checked_flags(event, "event", times.size)
    arm = checked_flags(experimental, "experimental", times.size)
    strata, _ = checked_codes(stratum, "stratum", times.size)
    if permutations < 1:
        raise ValueError(f"permutations is {permutations!r}; accepted: at least 1")
    codes = np.zeros(times.size, dtype=np.int64) if strata is None else strata.astype(np.int64)
    observed = logrank(times, events, arm, stratum=codes, direction=direction)
    subjects = _Subjects(times, events, arm, codes)
    if checked_choice(follow_up, "follow_up", ("equal", "unequal")) == "unequal":
        return _drawn(observed.z, _unequal(subjects, direction, random, permutations))
    scores = direction * -_subject_scores(subjects)
    own = float(scores[arm].sum())
    if _allocations_possible(subjects) <= MOST_LISTED:
        return _listed(own, _all_allocations(scores, subjects))
    return _drawn(own, _allocations(scores, subjects, random, permutations))


def _subject_scores(subjects: _Subjects) -> Floats:
    """Observed - expected events of each subject, under no difference between the arms; shape (n,)."""
    scores = subjects.event.astype(np.float64)
    for rows in subjects.within:
        table = risk_table(subjects.time[rows], subjects.event[rows])
        hazard = np.cumsum(table.events[0] / table.at_risk[0])
        scores[rows] -= hazard[np.searchsorted(table.time, subjects.time[rows])]
    return scores


def _allocations_possible(subjects: _Subjects) -> int:
    return math.prod(math.comb(rows.size, int(subjects.arm[rows].sum())) for rows in subjects.within)


def _all_allocations(scores: Floats, subjects: _Subjects) -> Floats:
    """The score of every allocation that keeps the numbers of each stratum."""
    per_stratum = [
        [math.fsum(chosen) for chosen in combinations(scores[rows].tolist(), int(subjects.arm[rows].sum()))]
        for rows in subjects.within
    ]
    return np.array([math.fsum(parts) for parts in product(*per_stratum)])


def _allocations(scores: Floats, subjects: _Subjects, random: np.random.Generator, count: int) -> Floats:
    """The scores of allocations drawn at random."""
    total = np.zeros(count)
    for rows in subjects.within:
        size = int(subjects.arm[rows].sum())
        total += [scores[random.permutation(rows)[:size]].sum() for _ in range(count)]
    return total


def _listed(own: float, listed: Floats) -> PermutationResult:
    """Exact p-values: the allocation observed is among those listed."""
    one, two = _as_extreme(own, listed)
    size = listed.size
    return PermutationResult(one / size, two / size, 0.0, 0.0, size, listed_all=True)


def _drawn(own: float, drawn: Floats) -> PermutationResult:
    one, two = ((1 + count) / (1 + drawn.size) for count in _as_extreme(own, drawn))
    errors = [math.sqrt(share * (1.0 - share) / drawn.size) for share in (one, two)]
    return PermutationResult(one, two, errors[0], errors[1], drawn.size, listed_all=False)


def _as_extreme(own: float, others: Floats) -> tuple[int, int]:
    """How many are at least as far in favour of the experimental arm, and in either direction."""
    slack = SAME * max(float(np.abs(others).max()), abs(own))
    return int(np.sum(others >= own - slack)), int(np.sum(np.abs(others) >= abs(own) - slack))


def _unequal(subjects: _Subjects, direction: Direction, random: np.random.Generator, count: int) -> Floats:
    """z of allocations that exchange event times, drawn where censored, and leave censoring with its arm."""
    z = np.empty(count)
    for index in range(count):
        occurs, censored = subjects.time.copy(), subjects.time.copy()
        for cell in subjects.open_events:
            occurs[cell.rows] = cell.draw(random)
        for cell in subjects.open_censorings:
            censored[cell.rows] = cell.draw(random)
        for rows in subjects.within:
            occurs[rows] = occurs[random.permutation(rows)]
        time, event = np.minimum(occurs, censored), occurs <= censored
        z[index] = _z_or_zero(time, event, subjects, direction)
    return z


def _z_or_zero(time: Floats, event: Bools, subjects: _Subjects, direction: Direction) -> float:
    """An allocation in which nothing tells the arms apart speaks for neither."""
    try:
        return logrank(time, event, subjects.arm, stratum=subjects.stratum, direction=direction).z
    except NotEstimable:
        return 0.0


@dataclass(frozen=True, eq=False)
class _Unseen:
    """Subjects of whom one time was not seen, and the curve that it is drawn from, beyond what was seen.

    `left` is the curve just after each subject's own time; `never` is what stands for no time at all.
    """

    rows: Ints
    time: Floats
    survival: Floats
    left: Floats
    never: float

    def draw(self, random: np.random.Generator) -> Floats:
        """A time for each subject, by inversion of the curve."""
        down_to = self.left * (1.0 - random.random(self.rows.size))
        position = np.searchsorted(-self.survival, -down_to, side="left")
        return np.append(self.time, self.never)[position]


@dataclass(frozen=True, eq=False)
class _Subjects:
    """One entry per subject, and what is unseen of them in each stratum."""

    time: Floats
    event: Bools
    arm: Bools
    stratum: Ints

    @cached_property
    def within(self) -> list[Ints]:
        """The subjects of each stratum."""
        return [np.flatnonzero(self.stratum == code) for code in np.unique(self.stratum)]

    @cached_property
    def open_events(self) -> list[_Unseen]:
        """The censored, whose event comes later than the censoring or never."""
        return [self._beyond(rows, self.event, after=True, never=math.inf) for rows in self.within]

    @cached_property
    def open_censorings(self) -> list[_Unseen]:
        """Those with the event, whose censoring comes at its time at the earliest, the last in their arm at
        most.
        """
        cells = [rows[self.arm[rows] == value] for rows in self.within for value in (False, True)]
        return [
            self._beyond(rows, ~self.event, after=False, never=float(self.time[rows].max()))
            for rows in cells
            if rows.size
        ]

    def _beyond(self, rows: Ints, ends: Bools, *, after: bool, never: float) -> _Unseen:
        table = risk_table(self.time[rows], ends[rows])
        survival = product_limit(table.at_risk[0], table.events[0])
        unseen = rows[~ends[rows]]
        position = np.searchsorted(table.time, self.time[unseen], side="right" if after else "left")
        return _Unseen(unseen, table.time, survival, np.append(1.0, survival)[position], never)
