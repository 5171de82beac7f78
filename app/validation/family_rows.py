"""Check values of the fixed families: constants, nominal levels and what their looks cost."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from functools import lru_cache

from scipy.special import ndtr

from app.model.plan import Design, Efficacy
from app.model.values import Absent, Estimate
from app.sequential.design import planned_boundary
from app.validation.rows import Mark, PublishedRow

BOOK = "Jennison & Turnbull (2000), Group Sequential Methods"
WANG_TSIATIS_1987 = f"{BOOK}, Table 2.9; Wang & Tsiatis (1987), Biometrics 43"
POCOCK_1977 = "Pocock (1977), Biometrika 64"
NOMINAL_LEVELS = "O'Brien & Fleming (1979), Biometrics 35, as in Schulz & Grimes (2005), Lancet 365"
LAN_DEMETS = "as quoted in Lan & DeMets (1983), Biometrika 70"
BHAT = (
    "DeMets, Hardy, Friedman & Lan (1984), Controlled Clinical Trials 5; BHAT Research Group (1982), JAMA 247"
)
HAYBITTLE_PETO = f"value remembered without its table, probably {BOOK}"
NO_PUBLICATION = "none; recursive quadrature of another author, checked by multivariate normal integration"

REPRODUCED: Mark = "value from memory, reproduced by computation"
COMPUTED: Mark = "computed independently"

LOOKS = range(2, 11)

POCOCK = Efficacy("Pocock")
OBRIEN_FLEMING = Efficacy("O'Brien-Fleming")
HAYBITTLE_PETO_AT_3 = Efficacy("Haybittle-Peto", interim_z=3.0)
HAYBITTLE_PETO_AT_P_001 = Efficacy("Haybittle-Peto", interim_z=3.290526731491894)  # two-sided p 0.001

# the final bound at 2, 3, ... 10 equally spaced looks, two-sided
FINAL_BOUNDS = (
    (POCOCK, 0.1, f"{BOOK}, Table 2.1", "1.875 1.992 2.067 2.122 2.164 2.197 2.225 2.249 2.270"),
    (POCOCK, 0.05, f"{BOOK}, Table 2.1", "2.178 2.289 2.361 2.413 2.453 2.485 2.512 2.535 2.555"),
    (POCOCK, 0.01, f"{BOOK}, Table 2.1", "2.772 2.873 2.939 2.986 3.023 3.053 3.078 3.099 3.117"),
    (OBRIEN_FLEMING, 0.1, f"{BOOK}, Table 2.3", "1.678 1.710 1.733 1.751 1.765 1.776 1.786 1.794 1.801"),
    (OBRIEN_FLEMING, 0.05, f"{BOOK}, Table 2.3", "1.977 2.004 2.024 2.040 2.053 2.063 2.072 2.080 2.087"),
    (OBRIEN_FLEMING, 0.01, f"{BOOK}, Table 2.3", "2.580 2.595 2.609 2.621 2.631 2.640 2.648 2.654 2.660"),
    (
        Efficacy("Wang-Tsiatis", shape=0.1),
        0.05,
        WANG_TSIATIS_1987,
        "1.994 2.026 2.050 2.068 2.083 2.094 2.104 2.113 2.120",
    ),
    (
        Efficacy("Wang-Tsiatis", shape=0.25),
        0.05,
        WANG_TSIATIS_1987,
        "2.038 2.083 2.113 2.136 2.154 2.168 2.180 2.190 2.199",
    ),
    (
        Efficacy("Wang-Tsiatis", shape=0.4),
        0.05,
        WANG_TSIATIS_1987,
        "2.111 2.186 2.233 2.267 2.292 2.313 2.329 2.343 2.355",
    ),
    (HAYBITTLE_PETO_AT_3, 0.05, HAYBITTLE_PETO, "1.967 1.975 1.983 1.990"),
    (
        HAYBITTLE_PETO_AT_3,
        0.05,
        NO_PUBLICATION,
        "1.967 1.975 1.983 1.990 1.997 2.003 2.010 2.016 2.021",
    ),
    (
        HAYBITTLE_PETO_AT_P_001,
        0.05,
        NO_PUBLICATION,
        "1.962 1.964 1.967 1.969 1.971 1.974 1.976 1.978 1.979",
    ),
)

# maximum over fixed information at 2, 3, ... 10 equally spaced looks, two-sided: family, alpha, power
INFLATIONS = (
    (POCOCK, 0.05, 0.8, f"{BOOK}, Table 2.2", "1.110 1.166 1.202 1.229 1.249 1.265 1.279 1.291 1.301"),
    (POCOCK, 0.05, 0.9, f"{BOOK}, Table 2.2", "1.100 1.151 1.183 1.207 1.225 1.239 1.252 1.262 1.271"),
    (POCOCK, 0.01, 0.9, NO_PUBLICATION, "1.084 1.125 1.152 1.170 1.185 1.197 1.206 1.215 1.222"),
    (
        OBRIEN_FLEMING,
        0.05,
        0.8,
        f"{BOOK}, Table 2.4",
        "1.008 1.017 1.024 1.028 1.032 1.035 1.037 1.038 1.040",
    ),
    (
        OBRIEN_FLEMING,
        0.05,
        0.9,
        f"{BOOK}, Table 2.4",
        "1.007 1.016 1.022 1.026 1.030 1.032 1.034 1.036 1.037",
    ),
    (OBRIEN_FLEMING, 0.01, 0.9, NO_PUBLICATION, "1.001 1.006 1.010 1.014 1.016 1.018 1.020 1.021 1.022"),
)

# the nominal two-sided level of every look: alpha, number of looks
POCOCK_LEVELS = (
    (0.05, (2, 3, 4, 5, 10), "0.0294 0.0221 0.0182 0.0158 0.0106"),
    (0.01, (2, 3, 4, 5), "0.0056 0.0041 0.0033 0.0028"),
)
# nominal two-sided levels look by look, alpha 0.05
OBRIEN_FLEMING_LEVELS = (
    "0.0005 0.014 0.045",
    "0.0001 0.004 0.019 0.043",
    "0.00001 0.0013 0.008 0.023 0.041",
)

# bounds look by look, two-sided 0.05, equally spaced
BOUNDS = (
    (OBRIEN_FLEMING, LAN_DEMETS, REPRODUCED, "4.56 3.23 2.63 2.28 2.04"),
    (OBRIEN_FLEMING, BHAT, REPRODUCED, "5.46 3.86 3.15 2.73 2.44 2.23 2.06"),
    (OBRIEN_FLEMING, NO_PUBLICATION, COMPUTED, "5.459 3.860 3.152 2.730 2.441 2.229 2.063"),
)


def family_rows() -> tuple[PublishedRow, ...]:
    """Every check value of the fixed families."""
    return (*_final_bound_rows(), *_bound_rows(), *_level_rows(), *_inflation_rows())


def _mark(publication: str) -> Mark:
    return COMPUTED if publication == NO_PUBLICATION else REPRODUCED


def _name(efficacy: Efficacy) -> str:
    shape = "" if efficacy.shape is None else f" with shape {efficacy.shape:g}"
    interim = "" if efficacy.interim_z is None else f" with {efficacy.interim_z:.5g} before the end"
    return f"{efficacy.spending}{shape}{interim}"


def _final_bound_rows() -> list[PublishedRow]:
    return [
        PublishedRow(
            f"{_name(efficacy)}, two-sided {alpha:g}, {looks} equal looks: final bound",
            publication,
            _mark(publication),
            digits,
            _bound(efficacy, alpha, looks, looks),
        )
        for efficacy, alpha, publication, line in FINAL_BOUNDS
        for looks, digits in zip(LOOKS, line.split(), strict=False)
    ]


def _bound_rows() -> list[PublishedRow]:
    return [
        PublishedRow(
            f"{_name(efficacy)}, two-sided 0.05, {len(line.split())} equal looks: bound at look {look}",
            publication,
            mark,
            digits,
            _bound(efficacy, 0.05, len(line.split()), look),
        )
        for efficacy, publication, mark, line in BOUNDS
        for look, digits in enumerate(line.split(), start=1)
    ]


def _level_rows() -> list[PublishedRow]:
    """A nominal level is the two-sided p of a bound."""
    pocock = [
        PublishedRow(
            f"Pocock, two-sided {alpha:g}, {looks} equal looks: nominal level",
            POCOCK_1977,
            REPRODUCED,
            digits,
            _level(POCOCK, alpha, looks, 1),
        )
        for alpha, counts, line in POCOCK_LEVELS
        for looks, digits in zip(counts, line.split(), strict=True)
    ]
    obrien_fleming = [
        PublishedRow(
            f"O'Brien-Fleming, two-sided 0.05, {len(line.split())} equal looks: nominal level at look {look}",
            NOMINAL_LEVELS,
            REPRODUCED,
            digits,
            _level(OBRIEN_FLEMING, 0.05, len(line.split()), look),
        )
        for line in OBRIEN_FLEMING_LEVELS
        for look, digits in enumerate(line.split(), start=1)
    ]
    return pocock + obrien_fleming


def _inflation_rows() -> list[PublishedRow]:
    return [
        PublishedRow(
            f"{_name(efficacy)}, two-sided {alpha:g}, power {power:g}, {looks} equal looks: inflation",
            publication,
            _mark(publication),
            digits,
            _inflation(efficacy, alpha, power, looks),
        )
        for efficacy, alpha, power, publication, line in INFLATIONS
        for looks, digits in zip(LOOKS, line.split(), strict=True)
    ]


def _bound(efficacy: Efficacy, alpha: float, looks: int, look: int) -> Callable[[], float]:
    return lambda: _planned(efficacy, alpha, 0.9, looks)[0][look - 1]


def _level(efficacy: Efficacy, alpha: float, looks: int, look: int) -> Callable[[], float]:
    bound = _bound(efficacy, alpha, looks, look)
    return lambda: 2.0 * float(ndtr(-bound()))


def _inflation(efficacy: Efficacy, alpha: float, power: float, looks: int) -> Callable[[], float]:
    return lambda: _planned(efficacy, alpha, power, looks)[1]


@lru_cache(maxsize=256)
def _planned(efficacy: Efficacy, alpha: float, power: float, looks: int) -> tuple[Sequence[float], float]:
    """Bounds and inflation of a two-sided plan with equally spaced looks."""
    fractions = tuple(look / looks for look in range(1, looks + 1))
    design = Design(alpha, 2, power, 0.75, 1000, fractions)
    planned = planned_boundary(design, efficacy, experimental_share=0.5, direction=1)
    return [_number(bound.efficacy_z) for bound in planned.bounds], _number(planned.inflation)


def _number(estimate: Estimate) -> float:
    if isinstance(estimate, Absent):
        raise ValueError(f"a check value exists here, ours does not: {estimate.reason}")
    return estimate
