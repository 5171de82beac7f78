"""Check values of conditional and predictive power and of inference after a stop."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

from scipy.special import ndtri

from app.sequential.density import Region
from app.sequential.family import planned_constant
from app.sequential.outlook import conditional_power_at, predictive_power_at
from app.sequential.stopping import Ended
from app.validation.rows import Mark, PublishedRow

LAN_WITTES = (
    "Lan & Wittes (1988), Biometrics 44; looks and deaths: DeMets et al. (1984), Controlled Clinical Trials 5"
)
BHAT = "looks and deaths: DeMets, Hardy, Friedman & Lan (1984), Controlled Clinical Trials 5, 362"
NO_PUBLICATION = "none; recursive quadrature of another author, checked by multivariate normal integration"
STAGEWISE = (
    "none; another author's computation by the method of Tsiatis, Rosner & Mehta (1984), Biometrics 40"
)

REPRODUCED: Mark = "value from memory, reproduced by computation"
COMPUTED: Mark = "computed independently"

FIXED = float(-ndtri(0.025))
DESIGN = FIXED + float(ndtri(0.9))  # the effect with power 0.9 at one look

# z, fraction; conditional power at the end against 1.95996 under no effect, the trend and the effect above;
# predictive power with a flat prior
CONDITIONAL_POWER = """
    1.5 0.5  0.1017 0.5903 0.8462 0.5641
    1   0.5  0.0382 0.2201 0.6986 0.2926
    0.5 0.5  0.0115 0.0382 0.5081 0.1051
    0   0.5  0.0028 0.0028 0.3157 0.0250
    2   0.3  0.1507 0.9784 0.9534 0.8659
    1.2 0.75 0.0328 0.1254 0.4127 0.1599
"""

# the beta-blocker trial at its last look, z 2.82 at 318 deaths: planned deaths, criterion, effect
BHAT_DEATHS = (56, 77, 126, 177, 247, 318)
BHAT_Z = 2.82
BHAT_POWER = (
    (400, "1.96", "null", "0.890", LAN_WITTES, REPRODUCED),
    (400, "2.063", "null", "0.841", BHAT, COMPUTED),
    (628, "1.96", "null", "0.526", BHAT, COMPUTED),
    (628, "1.96", "trend", "0.998", BHAT, COMPUTED),
    (628, "2.063", "null", "0.468", BHAT, COMPUTED),
    (628, "2.063", "trend", "0.997", BHAT, COMPUTED),
)


@dataclass(frozen=True)
class _End:
    """A two-sided 0.05 plan of equally spaced looks, and where the trial ended; digits of the answers."""

    name: str
    shape: float
    looks: int
    z: float
    stage: int
    p: str
    median: str
    interval: str
    naive: str
    repeated: str

    @property
    def bounds(self) -> tuple[float, ...]:
        fractions = [look / self.looks for look in range(1, self.looks + 1)]
        constant = planned_constant(self.shape, 0.025, 2, fractions)
        return tuple(constant * math.pow(fraction, self.shape - 0.5) for fraction in fractions)

    @property
    def fraction(self) -> float:
        return self.stage / self.looks

    @property
    def ended(self) -> Ended:
        looks = [look / self.looks for look in range(1, self.stage + 1)]
        regions = tuple(Region(-bound, bound) for bound in self.bounds[: self.stage - 1])
        return Ended(tuple(looks), regions, self.z)


ENDS = (
    _End(
        "O'Brien-Fleming, 5 looks, ended at look 3 with z 2.80",
        shape=0.0,
        looks=5,
        z=2.80,
        stage=3,
        p="0.002851",
        median="3.5959",
        interval="1.0510 6.1324",
        naive="3.6148 1.0845 6.1451",
        repeated="0.2147 7.0149",
    ),
    _End(
        "Pocock, 5 looks, ended at look 2 with z 2.70",
        shape=0.5,
        looks=5,
        z=2.70,
        stage=2,
        p="0.010175",
        median="4.0736",
        interval="0.6833 7.2575",
        naive="4.2691 1.1701 7.3681",
        repeated="0.4535 8.0846",
    ),
    _End(
        "BHAT: O'Brien-Fleming, 7 looks, ended at look 6 with z 2.82",
        shape=0.0,
        looks=7,
        z=2.82,
        stage=6,
        p="0.008938",
        median="2.7432",
        interval="0.4809 4.9473",
        naive="3.0459 0.9289 5.1630",
        repeated="0.6387 5.4532",
    ),
)
BHAT_END = ENDS[2]


def outlook_rows() -> tuple[PublishedRow, ...]:
    """Every check value of going on and of ending."""
    return (
        *_conditional_power_rows(),
        *_bhat_power_rows(),
        *(row for end in ENDS for row in _end_rows(end)),
        *_bhat_ratio_rows(),
    )


def _conditional_power_rows() -> list[PublishedRow]:
    return [row for line in CONDITIONAL_POWER.strip().splitlines() for row in _power_rows(*line.split())]


def _power_rows(z: str, fraction: str, *digits: str) -> list[PublishedRow]:
    at, t = float(z), float(fraction)
    quantities: list[tuple[str, Callable[[], float]]] = [
        ("conditional power under no effect", lambda: conditional_power_at(at, t, FIXED, 1.0, 0.0)),
        (
            "conditional power under the trend",
            lambda: conditional_power_at(at, t, FIXED, 1.0, at / math.sqrt(t)),
        ),
        (
            "conditional power under the design effect of power 0.9",
            lambda: conditional_power_at(at, t, FIXED, 1.0, DESIGN),
        ),
        ("predictive power with a flat prior", lambda: predictive_power_at(at, t, FIXED, 1.0)),
    ]
    return [
        PublishedRow(
            f"z {z} at fraction {fraction}, final criterion 1.95996: {what}",
            NO_PUBLICATION,
            COMPUTED,
            expected,
            compute,
        )
        for (what, compute), expected in zip(quantities, digits, strict=True)
    ]


def _bhat_power_rows() -> list[PublishedRow]:
    return [
        PublishedRow(
            f"BHAT at look 6 of {planned} planned deaths: conditional power against {criterion}, {effect}",
            publication,
            mark,
            expected,
            _bhat_power(planned, float(criterion), effect),
        )
        for planned, criterion, effect, expected, publication, mark in BHAT_POWER
    ]


def _bhat_power(planned: int, criterion: float, effect: str) -> Callable[[], float]:
    t = BHAT_DEATHS[-1] / planned
    noncentrality = BHAT_Z / math.sqrt(t) if effect == "trend" else 0.0
    return lambda: conditional_power_at(BHAT_Z, t, criterion, 1.0, noncentrality)


def _end_rows(end: _End) -> list[PublishedRow]:
    """Answers on the scale of the mean of z at full information."""
    scale = math.sqrt(end.fraction)

    def shifted(by: Callable[[], float]) -> Callable[[], float]:
        return lambda: (end.z + by()) / scale

    low, high = end.interval.split()
    naive, naive_low, naive_high = end.naive.split()
    repeated_low, repeated_high = end.repeated.split()
    answers: list[tuple[str, str, Callable[[], float]]] = [
        ("one-sided p", end.p, lambda: end.ended.probability_of_more(0.0)),
        ("median-unbiased estimate", end.median, lambda: end.ended.drift_with(0.5)),
        ("lower 95% limit", low, lambda: end.ended.drift_with(0.025)),
        ("upper 95% limit", high, lambda: end.ended.drift_with(0.975)),
        ("naive estimate", naive, shifted(lambda: 0.0)),
        ("naive lower limit", naive_low, shifted(lambda: -FIXED)),
        ("naive upper limit", naive_high, shifted(lambda: FIXED)),
        ("repeated lower limit", repeated_low, shifted(lambda: -end.bounds[end.stage - 1])),
        ("repeated upper limit", repeated_high, shifted(lambda: end.bounds[end.stage - 1])),
    ]
    return [
        PublishedRow(f"{end.name}: {what}", STAGEWISE, COMPUTED, expected, compute)
        for what, expected, compute in answers
    ]


def _bhat_ratio_rows() -> list[PublishedRow]:
    """Hazard ratios with V = 318 / 4, by equally spaced looks and by the deaths as information."""
    by_looks, by_deaths = BHAT_END.ended, Ended(BHAT_DEATHS, BHAT_END.ended.regions, BHAT_Z)
    looks_unit = math.sqrt(BHAT_END.fraction / (BHAT_DEATHS[-1] / 4.0))

    def by(ended: Ended, probability: float, unit: float) -> Callable[[], float]:
        return lambda: math.exp(-ended.drift_with(probability) * unit)

    answers: list[tuple[str, str, Callable[[], float]]] = [
        ("naive hazard ratio", "0.729", lambda: math.exp(-BHAT_Z / math.sqrt(BHAT_DEATHS[-1] / 4.0))),
        ("median-unbiased hazard ratio", "0.752", by(by_looks, 0.5, looks_unit)),
        ("lower 95% limit of the ratio", "0.598", by(by_looks, 0.975, looks_unit)),
        ("upper 95% limit of the ratio", "0.951", by(by_looks, 0.025, looks_unit)),
        ("one-sided p, deaths as information", "0.00957", lambda: by_deaths.probability_of_more(0.0)),
        ("median-unbiased ratio, deaths as information", "0.750", by(by_deaths, 0.5, 2.0)),
        ("lower 95% limit, deaths as information", "0.597", by(by_deaths, 0.975, 2.0)),
        ("upper 95% limit, deaths as information", "0.953", by(by_deaths, 0.025, 2.0)),
    ]
    return [
        PublishedRow(f"{BHAT_END.name}: {what}", BHAT, COMPUTED, expected, compute)
        for what, expected, compute in answers
    ]
