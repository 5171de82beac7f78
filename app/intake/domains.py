"""What a key of the plan may hold: told in words, tested, and turned into the model's type."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from datetime import date
from itertools import pairwise
from typing import Any

LONGEST_TEXT = 200
MOST_WEIGHTS = 12  # as many as the joint probability of their largest is computed for
LARGEST_WHOLE = 10**9
LARGEST_Z = 100  # no probability is left that a double could hold long before it


def _same(value: Any) -> Any:
    return value


@dataclass(frozen=True)
class Domain:
    """`accepted` tells a person what `holds` tests; `convert` makes the model's type of it."""

    accepted: str
    holds: Callable[[Any], bool]
    convert: Callable[[Any], Any] = _same


def is_number(value: Any) -> bool:
    """A finite number; TOML's true and false are none, although Python counts with them."""
    if isinstance(value, float):
        return math.isfinite(value)
    return is_whole(value)


def is_whole(value: Any) -> bool:
    return isinstance(value, int) and not isinstance(value, bool) and abs(value) <= LARGEST_WHOLE


def is_text(value: Any) -> bool:
    """One line that a page or a column header can hold as it is."""
    return (
        isinstance(value, str)
        and 0 < len(value) <= LONGEST_TEXT
        and value == value.strip()
        and value.isprintable()
    )


def is_pair(value: Any) -> bool:
    return isinstance(value, list) and len(value) == 2 and all(map(is_number, value))


def increases(values: list[float]) -> bool:
    return all(earlier < later for earlier, later in pairwise(values))


def one_of(*words: str) -> Domain:
    return Domain(", ".join(map(repr, words)), lambda value: isinstance(value, str) and value in words)


def whole(least: int) -> Domain:
    return Domain(
        f"a whole number from {least} to {LARGEST_WHOLE:,}", lambda value: is_whole(value) and value >= least
    )


def number(accepted: str, holds: Callable[[float], bool]) -> Domain:
    return Domain(accepted, lambda value: is_number(value) and holds(value), float)


def _is_look_list(value: Any) -> bool:
    listed = isinstance(value, list) and len(value) > 0 and all(map(is_number, value))
    return listed and value[0] > 0 and value[-1] == 1 and increases(value)


def _is_point_list(value: Any) -> bool:
    if not (isinstance(value, list) and value and all(map(is_pair, value))):
        return False
    fractions, alphas = zip(*value, strict=True)
    ordered = increases(list(fractions)) and all(a <= b for a, b in pairwise(alphas))
    return ordered and fractions[0] > 0 and fractions[-1] == 1 and alphas[0] >= 0 and alphas[-1] < 1


def _is_name_list(value: Any) -> bool:
    return isinstance(value, list) and all(map(is_text, value)) and len(set(value)) == len(value)


def _is_time_list(value: Any) -> bool:
    listed = isinstance(value, list) and len(value) > 0 and all(map(is_number, value))
    return listed and value[0] > 0 and increases(value)


def _is_weight_list(value: Any) -> bool:
    listed = isinstance(value, list) and len(value) > 0 and all(map(is_pair, value))
    return listed and len(value) <= MOST_WEIGHTS and all(rho >= 0 and gamma >= 0 for rho, gamma in value)


def _is_allocation(value: Any) -> bool:
    return isinstance(value, list) and len(value) == 2 and all(is_whole(n) and n >= 1 for n in value)


def _floats(values: list[float]) -> tuple[float, ...]:
    return tuple(map(float, values))


def _float_pairs(pairs: list[list[float]]) -> tuple[tuple[float, float], ...]:
    return tuple((float(a), float(b)) for a, b in pairs)


TEXT = Domain(f"a text on one line, of 1 to {LONGEST_TEXT} characters, without blanks at its ends", is_text)
FLAG = Domain("true or false", lambda value: isinstance(value, bool))
DAY = Domain("a date written yyyy-mm-dd, without quotes", lambda value: type(value) is date)
SIDES = Domain("1 or 2", lambda value: is_whole(value) and value in (1, 2))
ALLOCATION = Domain(
    "two whole numbers of at least 1, control then experimental, such as [1, 1]", _is_allocation, tuple
)
NAMES = Domain("a list of different column names", _is_name_list, tuple)
LOOKS = Domain(
    "a list of information fractions above 0, each larger than the one before, the last of them 1",
    _is_look_list,
    _floats,
)
POINTS = Domain(
    "a list of [information fraction, cumulative alpha of one side], fractions increasing to 1, "
    "alphas never falling",
    _is_point_list,
    _float_pairs,
)
TIMES = Domain("a list of times above 0, each larger than the one before", _is_time_list, _floats)
WEIGHTS = Domain(
    f"a list of up to {MOST_WEIGHTS} pairs [rho, gamma], both at least 0", _is_weight_list, _float_pairs
)
SHARE = number("a number above 0 and below 1", lambda value: 0 < value < 1)
LEVEL = number("a number above 0 and below 0.5", lambda value: 0 < value < 0.5)
POSITIVE = number("a number above 0", lambda value: value > 0)
NOT_NEGATIVE = number("a number of at least 0", lambda value: value >= 0)
Z = number(f"a number from -{LARGEST_Z} to {LARGEST_Z}", lambda value: abs(value) <= LARGEST_Z)
EFFICACY_Z = number(f"a number above 0, at most {LARGEST_Z}", lambda value: 0 < value <= LARGEST_Z)
SPENT = number("a number of at least 0 and below 0.5", lambda value: 0 <= value < 0.5)
SHAPE = number(f"a number from -{LARGEST_Z} to {LARGEST_Z}", lambda value: abs(value) <= LARGEST_Z)
CONFIDENCE = number("a number above 0, at most 0.99999", lambda value: 0 < value <= 0.99999)
PRIOR = number("a number from 0.000001 to 1000000", lambda value: 1e-6 <= value <= 1e6)
VARIANCE = number(f"a number above 0, at most {LARGEST_WHOLE:,}", lambda value: 0 < value <= LARGEST_WHOLE)
FINITE = number("a finite number", lambda value: True)
RATIO = number("a hazard ratio above 0 and other than 1", lambda value: value > 0 and value != 1)
