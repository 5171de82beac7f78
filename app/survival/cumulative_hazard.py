"""The Nelson-Aalen estimate of the cumulative hazard of one group."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from app.model.survival import CumulativeHazard
from app.model.values import read_only
from app.survival.checked import checked_choice
from app.survival.intervals import two_sided_quantile
from app.survival.risk_table import risk_table

INTERVALS = ("plain", "log")


def nelson_aalen(
    time: ArrayLike, event: ArrayLike, *, level: float = 0.95, interval: str = "log"
) -> CumulativeHazard:
    """Estimate the cumulative hazard of one group, with pointwise confidence limits.

    Parameters
    ----------
    time : float array, shape (n,), finite, >= 0, in any one unit
    event : bool array, shape (n,); True = event at `time`, False = censored there
    level : confidence level of the limits, between 0 and 1
    interval : scale of the limits: "plain" (cut at 0) or "log"

    Returns
    -------
    CumulativeHazard
        a row per distinct time, shape (m,): hazard [events per subject], its standard error and limits.

    Raises
    ------
    ValueError : an argument breaks a domain above - a bug in the caller.

    Notes
    -----
    *Convention*: the sum of d / n; its variance is Aalen's sum of d / n^2. Before the first event the hazard
    and its standard error are 0 and limits do not exist (NaN).
    *Accuracy*: sums of at most m terms; relative error below 1e-12 for m <= 1e6.
    *Checked*: by hand (tests/byhand), R and libraries (tests/reference), a literal version (tests/naive.py).

    References
    ----------
    Nelson (1969), Journal of Quality Technology 1, 27-52. Aalen (1978), Annals of Statistics 6, 701-726.

    Examples
    --------
    >>> nelson_aalen([1, 2, 3, 4], [True, False, True, True]).hazard.tolist()
    [0.25, 0.25, 0.75, 1.75]
    """
    checked_choice(interval, "interval", INTERVALS)
    z = two_sided_quantile(level)
    table = risk_table(time, event)
    at_risk, events = table.at_risk[0].astype(np.float64), table.events[0]
    hazard = np.cumsum(events / at_risk)
    error = np.sqrt(np.cumsum(events / at_risk**2))
    low, high = np.full((2, hazard.size), np.nan)
    begun = slice(int(np.count_nonzero(hazard == 0.0)), None)
    if interval == "log":
        factor = np.exp(z * error[begun] / hazard[begun])
        low[begun], high[begun] = hazard[begun] / factor, hazard[begun] * factor
    else:
        low[begun] = np.maximum(hazard[begun] - z * error[begun], 0.0)
        high[begun] = hazard[begun] + z * error[begun]
    return CumulativeHazard(
        time=read_only(table.time, np.float64),
        at_risk=read_only(table.at_risk[0], np.int64),
        events=read_only(events, np.int64),
        hazard=read_only(hazard, np.float64),
        std_error=read_only(error, np.float64),
        ci_low=read_only(low, np.float64),
        ci_high=read_only(high, np.float64),
        level=level,
        interval=interval,
    )
