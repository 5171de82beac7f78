"""Weights of the log-rank family: how much the difference at each event time counts.

A weight takes the numbers at risk n and of events d, both arms together, at the event times of one stratum,
shape (m,), and returns a weight >= 0 at each.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from app.model.values import Floats
from app.survival.risk_table import EventTable


@dataclass(frozen=True)
class Weight:
    """A weight with the name that its authors gave it; `rho` and `gamma` where it is Fleming-Harrington's."""

    name: str
    of: Callable[[Floats, Floats], Floats]
    rho: float | None = None
    gamma: float | None = None

    def at_events(self, table: EventTable) -> Floats:
        """The weight at each event time of the table, shape (m,), each stratum on its own."""
        n, d = table.at_risk_in_all, table.events_in_all
        weights = np.empty(n.size)
        for span in table.spans():
            weights[span] = self.of(n[span], d[span])
        return weights


def fleming_harrington(rho: float, gamma: float) -> Weight:
    """S(t-)^rho (1 - S(t-))^gamma with the pooled Kaplan-Meier curve just before t; both exponents >= 0.

    Harrington & Fleming (1982), Biometrika 69, 553-566; Fleming & Harrington (1991), Counting Processes and
    Survival Analysis. (0, 0) is the log-rank test, (1, 0) counts early differences more, (0, 1) late ones.
    """
    for name, value in (("rho", rho), ("gamma", gamma)):
        if not 0.0 <= value < np.inf:
            raise ValueError(f"{name} is {value!r}; accepted: a number >= 0")

    def of(n: Floats, d: Floats) -> Floats:
        before = _just_before((n - d) / n)
        return np.asarray(before**rho * (1.0 - before) ** gamma, dtype=np.float64)

    return Weight(f"Fleming-Harrington ({rho:g}, {gamma:g})", of, rho, gamma)


def _just_before(factors: Floats) -> Floats:
    """The product of the factors of earlier times: the left-continuous curve."""
    before = np.ones(factors.size)
    np.cumprod(factors[:-1], out=before[1:])
    return before


def _with_one_more(n: Floats, d: Floats) -> Floats:
    """The curve of Peto & Peto, which never reaches 0: one more is at risk at each time."""
    return np.asarray(np.cumprod(1.0 - d / (n + 1.0)), dtype=np.float64)


LOG_RANK = Weight("log-rank", lambda n, d: np.ones(n.size))
"""Mantel (1966), Cancer Chemotherapy Reports 50, 163-170."""
GEHAN_BRESLOW = Weight("Gehan-Breslow", lambda n, d: n)
"""Gehan (1965), Biometrika 52, 203-223; Breslow (1970), Biometrika 57, 579-594: the number at risk."""
TARONE_WARE = Weight("Tarone-Ware", lambda n, d: np.asarray(np.sqrt(n), dtype=np.float64))
"""Tarone & Ware (1977), Biometrika 64, 156-160: the root of the number at risk."""
PETO_PETO = Weight("Peto-Peto", lambda n, d: _with_one_more(n, d))
"""Peto & Peto (1972), JRSS A 135, 185-207: the product of 1 - d / (n + 1) up to and at the time."""
MODIFIED_PETO_PETO = Weight("modified Peto-Peto", lambda n, d: _with_one_more(n, d) * n / (n + 1.0))
"""Andersen, Borgan, Gill & Keiding (1982), International Statistical Review 50: times n / (n + 1)."""
