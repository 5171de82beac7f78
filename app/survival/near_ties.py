"""Times that differ only by rounding are one time."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from app.model.values import Floats
from app.survival.checked import checked_times

TOLERANCE = float(np.sqrt(np.finfo(np.float64).eps))


def merge_near_ties(time: ArrayLike) -> Floats:
    """Give times that differ by rounding only one common value, the smallest of them.

    Parameters
    ----------
    time : float array, shape (n,), finite, >= 0: the times of all arms and strata together

    Returns
    -------
    float array, shape (n,)
        the same times in the same order, near-tied ones replaced.

    Raises
    ------
    ValueError : `time` breaks the domain above - a bug in the caller.

    Notes
    -----
    *Convention*: neighbours among the sorted distinct times are tied when their gap is at most
    sqrt(machine epsilon), 1.5e-8, absolutely or relative to the mean distinct time; ties chain.
    The rule is that of R's survival package (function aeqSurv). Times in whole days need none of this.
    *Accuracy*: exact; values are copied, never averaged.
    *Checked*: R survival (tests/unit/survival/test_near_ties.py), properties.

    Examples
    --------
    >>> merge_near_ties([0.3, 0.1 + 0.2, 1.0]).tolist()
    [0.3, 0.3, 1.0]
    """
    times = checked_times(time)
    distinct, position = np.unique(times, return_inverse=True)
    apart = np.diff(distinct) > TOLERANCE * max(1.0, distinct.mean() if distinct.size else 1.0)
    if apart.all():
        return times
    group = np.concatenate([[0], np.cumsum(apart)])
    smallest = distinct[np.concatenate([[True], apart])]
    return np.asarray(smallest[group][position], dtype=np.float64)
