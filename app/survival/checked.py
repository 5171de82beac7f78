"""Arguments as arrays of the right shape and domain, or ValueError: a bug in the caller."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from app.model.values import Bools, Counts, Floats


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


def checked_codes(codes: ArrayLike | None, name: str, size: int) -> tuple[Counts | None, int]:
    """Group or stratum codes as integers, shape (size,), with how many codes there are, or ValueError.

    No codes at all are None, one code; boolean ones are two, in a byte each.
    """
    if codes is None:
        return None, 1
    values = np.asarray(codes)
    if values.shape != (size,):
        raise ValueError(f"{name} has shape {values.shape}; accepted: ({size},), as time")
    if values.dtype == np.bool_:
        return values.astype(np.int8), 2
    if size == 0:
        return None, 1
    if not np.issubdtype(values.dtype, np.integer) or values.min() < 0:
        raise ValueError(f"{name} holds {values.min()!r}; accepted: integer codes from 0")
    return values.astype(np.int64, copy=False), int(values.max()) + 1


def checked_level(level: float) -> float:
    """`level` between 0 and 1, or ValueError."""
    if not 0.0 < level < 1.0:
        raise ValueError(f"level is {level!r}; accepted: a number between 0 and 1")
    return level


def checked_choice(value: str, name: str, accepted: tuple[str, ...]) -> str:
    """`value` if it is one of those accepted, or ValueError."""
    if value not in accepted:
        raise ValueError(f"{name} is {value!r}; accepted: {', '.join(map(repr, accepted))}")
    return value
