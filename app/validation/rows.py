"""One published number as a row: where it stands in print, its digits, and how the program computes it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from decimal import Decimal
from typing import Literal

Mark = Literal[
    "printed",
    "value from memory",
    "value from memory, reproduced by computation",
    "computed independently",
]

ROUNDING_SLACK = 1e-6  # of one unit: a computed value may sit on the rounding edge itself


@dataclass(frozen=True)
class PublishedRow:
    """A number from outside the project. `expected` keeps its digits as printed: they are its tolerance.

    `units` is the distance allowed, in units of the last printed digit: half a unit is the rounding of print.
    A row that needs more says why in `note`.
    """

    quantity: str
    publication: str
    mark: Mark
    expected: str
    compute: Callable[[], float]
    note: str = ""
    units: float = 0.5

    def __post_init__(self) -> None:
        if self.units != 0.5 and not self.note:
            raise ValueError(f"{self.quantity}: a tolerance of {self.units} units needs a note saying why")

    @property
    def tolerance(self) -> float:
        """`units` of the last printed digit: 0.0005 for '2.178', 5e-08 for '4.17e-5'."""
        return (self.units + ROUNDING_SLACK) * last_printed_unit(self.expected)

    def check(self) -> RowOutcome:
        computed = float(self.compute())
        return RowOutcome(self, computed, agrees=abs(computed - float(self.expected)) <= self.tolerance)


@dataclass(frozen=True)
class RowOutcome:
    """What the program computed for a row, and whether it agrees to the printed digits."""

    row: PublishedRow
    computed: float
    agrees: bool


def last_printed_unit(digits: str) -> float:
    """One unit of the last printed digit: 0.001 for '2.178', 1e-07 for '4.17e-5', 1 for '21'."""
    exponent = Decimal(digits).as_tuple().exponent
    if not isinstance(exponent, int):
        raise ValueError(f"a published value is a finite number; found {digits!r}")
    return 10.0**exponent
