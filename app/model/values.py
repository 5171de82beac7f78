"""Small values that every noun is made of."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, DTypeLike, NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]
Counts = NDArray[np.signedinteger[Any]]
"""Integers that count subjects, in a type that is wide enough for them."""


@dataclass(frozen=True)
class Absent:
    """A quantity that was asked for and cannot be estimated, or does not exist, with the reason in words."""

    reason: str


Estimate = float | Absent
"""A number, or the reason there is none; never NaN."""


def read_only(values: ArrayLike, dtype: DTypeLike) -> NDArray[Any]:
    """A copy of `values` as an array that refuses writing, so that records can be shared."""
    array = np.array(values, dtype=dtype)
    array.flags.writeable = False
    return array
