"""How a finding is put together: five parts, the first rows and their count, and no identifiers."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike

from app.model.extract import Finding, Severity

ROWS_SHOWN = 5
LONGEST_QUOTE = 40


def finding(
    id: str,
    severity: Severity,
    what: str,
    where: str,
    found: str,
    accepted: str,
    remedy: str,
    *,
    rows: ArrayLike = (),
) -> Finding:
    """A finding on data rows `rows` (counted from 1), of which the first five are kept."""
    numbers = np.asarray(rows, dtype=np.int64)
    first = tuple(int(number) for number in numbers[:ROWS_SHOWN])
    return Finding(id, severity, what, where, found, accepted, remedy, rows=first, count=int(numbers.size))


def row_list(rows: ArrayLike, values: Sequence[str] = ()) -> str:
    """`1 row: 12 ('-4')` or `7 rows, the first 4 (blank), 9 (blank)...`, with what stands in them."""
    numbers = np.asarray(rows, dtype=np.int64)
    shown = [str(number) for number in numbers[:ROWS_SHOWN]]
    if values:
        shown = [f"{number} ({value})" for number, value in zip(shown, values, strict=False)]
    if numbers.size == 1:
        return f"1 row: {shown[0]}"
    introduction = ":" if numbers.size <= ROWS_SHOWN else ", the first"
    return f"{numbers.size:,} rows{introduction} {', '.join(shown)}"


def quoted(text: str) -> str:
    """A value of the extract as it stands there, cut where it is long; nothing is `blank`."""
    if not text.strip():
        return "blank"
    return repr(text if len(text) <= LONGEST_QUOTE else f"{text[:LONGEST_QUOTE]}...")
