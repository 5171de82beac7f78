"""Events, subjects and time that a trial with one look needs. Hazards and times share one time unit."""

from __future__ import annotations

import math
from dataclasses import dataclass

from scipy.optimize import brentq
from scipy.special import ndtri

from app.errors import DesignInvalid


def schoenfeld_events(
    hazard_ratio: float, *, alpha_one_side: float, power: float, experimental_share: float = 0.5
) -> float:
    """Events for the log-rank test: (z(1 - a) + z(power))^2 / (p q log^2 HR), not rounded.

    Parameters
    ----------
    hazard_ratio : experimental / control, positive, other than 1
    alpha_one_side, power : floats in (0, 1), alpha_one_side below power
    experimental_share : p, float in (0, 1); q = 1 - p

    References
    ----------
    Schoenfeld (1981), Biometrika 68, 316-319; (1983), Biometrics 39, 499-503.
    """
    shares = experimental_share * (1.0 - experimental_share)
    return _fixed_noncentrality(alpha_one_side, power) ** 2 / (shares * math.log(hazard_ratio) ** 2)


def freedman_events(
    hazard_ratio: float, *, alpha_one_side: float, power: float, experimental_share: float = 0.5
) -> float:
    """Events for the log-rank test: (z(1 - a) + z(power))^2 (1 + f HR)^2 / (f (1 - HR)^2), not rounded.

    f is experimental over control subjects; domains as in `schoenfeld_events`, from which the answer differs.

    References
    ----------
    Freedman (1982), Statistics in Medicine 1, 121-129.
    """
    ratio = experimental_share / (1.0 - experimental_share)
    spread = (1.0 + ratio * hazard_ratio) ** 2 / (ratio * (1.0 - hazard_ratio) ** 2)
    return _fixed_noncentrality(alpha_one_side, power) ** 2 * spread


def _fixed_noncentrality(alpha_one_side: float, power: float) -> float:
    return float(ndtri(power) - ndtri(alpha_one_side))


@dataclass(frozen=True)
class Recruitment:
    """Uniform entry over `accrual`, follow-up until `total` from the first entry, exponential drop-out."""

    accrual: float
    total: float
    dropout_hazard: float = 0.0

    def __post_init__(self) -> None:
        if not (0.0 <= self.accrual <= self.total and self.total > 0.0 and self.dropout_hazard >= 0.0):
            raise ValueError(
                f"recruitment needs 0 <= accrual <= total and no negative drop-out, got {self!r}"
            )

    def event_probability(self, hazard: float) -> float:
        """Probability that a subject's event is seen: exponential event and drop-out, uniform entry.

        Lachin & Foulkes (1986): h / (h + e) times the chance of leaving before the end at all.
        """
        leaving = hazard + self.dropout_hazard
        if self.accrual == 0.0:
            staying = math.exp(-leaving * self.total)
        else:
            until_last_entry = leaving * (self.total - self.accrual)
            staying = (
                -math.exp(-until_last_entry) * math.expm1(-leaving * self.accrual) / (leaving * self.accrual)
            )
        return hazard / leaving * (1.0 - staying)


def expected_events(
    subjects: float,
    recruitment: Recruitment,
    *,
    control_hazard: float,
    hazard_ratio: float,
    experimental_share: float = 0.5,
) -> float:
    """Events expected by the end of `recruitment` in both arms."""
    seen = (1.0 - experimental_share) * recruitment.event_probability(control_hazard)
    seen += experimental_share * recruitment.event_probability(control_hazard * hazard_ratio)
    return subjects * seen


def lachin_foulkes_subjects(
    recruitment: Recruitment,
    *,
    control_hazard: float,
    hazard_ratio: float,
    alpha_one_side: float,
    power: float,
    experimental_share: float = 0.5,
    inflation: float = 1.0,
) -> float:
    """Subjects in both arms for a test of the difference of two exponential hazards, not rounded.

    Parameters
    ----------
    recruitment : entry, end and drop-out
    control_hazard : positive, per time unit
    hazard_ratio : experimental / control, positive, other than 1
    alpha_one_side, power : floats in (0, 1), alpha_one_side below power
    experimental_share : float in (0, 1)
    inflation : what the looks of a group-sequential plan cost, as a factor of the information

    Notes
    -----
    *Convention*: the variance under no effect uses the mean hazard, weighted by the shares (the pooled form).
    *Checked*: the worked example of the paper (app/validation/sequential_rows.py).

    References
    ----------
    Lachin (1981), Controlled Clinical Trials 2, 93-113; Lachin & Foulkes (1986), Biometrics 42, 507-519;
    inflation: Kim & Tsiatis (1990), Biometrics 46, 81-92.
    """
    shares = (1.0 - experimental_share, experimental_share)
    hazards = (control_hazard, control_hazard * hazard_ratio)
    pooled = math.fsum(share * hazard for share, hazard in zip(shares, hazards, strict=True))

    def spread(of: tuple[float, float]) -> float:
        """Standard deviation of the difference of hazards per subject: h^2 / P(event) in each arm."""
        parts = (h * h / recruitment.event_probability(h) / p for h, p in zip(of, shares, strict=True))
        return math.sqrt(math.fsum(parts))

    null, design = spread((pooled, pooled)), spread(hazards)
    distance = -float(ndtri(alpha_one_side)) * null + float(ndtri(power)) * design
    return inflation * (distance / (hazards[0] - hazards[1])) ** 2


def duration_for_events(
    events: float,
    subjects: float,
    *,
    accrual: float,
    control_hazard: float,
    hazard_ratio: float,
    experimental_share: float = 0.5,
    dropout_hazard: float = 0.0,
) -> float:
    """Time from the first entry until this many events are expected; entry is uniform over `accrual`.

    Raises
    ------
    DesignInvalid : so many events never come from these subjects.
    """

    def expected(total: float) -> float:
        """Before the end of accrual only those entered so far are followed."""
        entered = subjects * min(1.0, total / accrual) if accrual else subjects
        recruitment = Recruitment(min(accrual, total), total, dropout_hazard)
        return expected_events(
            entered,
            recruitment,
            control_hazard=control_hazard,
            hazard_ratio=hazard_ratio,
            experimental_share=experimental_share,
        )

    slowest = min(control_hazard, control_hazard * hazard_ratio)
    longest = accrual + 60.0 / slowest  # by then all but e^-60 have had their event or dropped out
    most = expected(longest)
    if events >= most:
        raise DesignInvalid(
            "more events are wanted than these subjects will have",
            found=f"{events:g} events of {subjects:g} subjects",
            accepted=f"fewer than {most:.1f}",
            remedy="plan more subjects, or fewer events",
        )
    shortest = longest * 1e-12
    return float(brentq(lambda total: expected(total) - events, shortest, longest, xtol=1e-12, rtol=1e-13))
