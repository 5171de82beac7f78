"""Check values of spending, boundaries and repeated tests; what print says is quoted from memory."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import cache, lru_cache
from itertools import starmap

from scipy.special import ndtri

from app.model.plan import Efficacy, Sides
from app.model.values import Absent, Estimate
from app.sequential.boundary import EfficacyRule, LookAhead, bounds_ahead
from app.sequential.density import Region, crossing_probabilities
from app.sequential.spending import SpendingFunction, spending_function
from app.validation.rows import Mark, PublishedRow

LAN_DEMETS = "Lan & DeMets (1983), Biometrika 70; DeMets & Lan (1994), Statistics in Medicine 13"
LAN_DEMETS_1983 = "Lan & DeMets (1983), Biometrika 70, Table 1"
BHAT = "looks and deaths: DeMets, Hardy, Friedman & Lan (1984), Controlled Clinical Trials 5, 362"
REPEATED_TESTS = "Armitage, McPherson & Rowe (1969), JRSS A 132"
NO_PUBLICATION = "none; recursive quadrature of another author, checked by multivariate normal integration"

OBRIEN_FLEMING = "O'Brien-Fleming-type"
POCOCK = "Pocock-type"
POWER = "power"
HWANG_SHIH_DECANI = "Hwang-Shih-DeCani"

REPRODUCED: Mark = "value from memory, reproduced by computation"
COMPUTED: Mark = "computed independently"

LAST_DIGIT = "one unit off in the last quoted digit"
BHAT_DEATHS = (56, 77, 126, 177, 247, 318)
BHAT_MONTHS = (11, 16, 21, 28, 34, 40)  # of 48, at the same looks


@dataclass(frozen=True)
class _Table:
    """One line of bounds in print: what it is, where it stands, and its digits look by look."""

    publication: str
    mark: Mark
    spending: str
    alpha: float
    sides: Sides
    fractions: tuple[float, ...]
    digits: str
    information: tuple[float, ...] = ()  # what correlations use, where alpha is spent by another clock
    label: str = ""
    key: float | None = None  # the exponent or parameter of a family of functions

    @property
    def name(self) -> str:
        looks = self.label or f"looks at {', '.join(f'{fraction:.4g}' for fraction in self.fractions)}"
        level = f"{'two-sided' if self.sides == 2 else 'one-sided'} {self.alpha:g}"
        key = "" if self.key is None else f" ({self.key:g})"
        return f"{self.spending}{key} bounds, {level}, {looks}"

    @property
    def function(self) -> SpendingFunction:
        """At the level of one side."""
        named = Efficacy(
            self.spending,
            exponent=self.key if self.spending == POWER else None,
            parameter=self.key if self.spending == HWANG_SHIH_DECANI else None,
        )
        return spending_function(named, self.alpha / self.sides)


@dataclass(frozen=True)
class _Known:
    """A quotation that computation does not reproduce to the last digit: by how many units, and why."""

    units: float
    note: str


EXACT = _Known(0.5, "")


def sequential_rows() -> tuple[PublishedRow, ...]:
    """Every check value of the group-sequential core."""
    return (*_bound_rows(), *_other_convention_rows(), *_spend_rows(), *_repeated_test_rows())


def _equal(looks: int) -> tuple[float, ...]:
    return tuple(look / looks for look in range(1, looks + 1))


TABLES = (
    # a two-sided test whose sides each spend 0.025 by their own function; O'Brien-Fleming-type
    _Table(NO_PUBLICATION, COMPUTED, OBRIEN_FLEMING, 0.05, 2, _equal(2), "2.9626 1.9686"),
    _Table(NO_PUBLICATION, COMPUTED, OBRIEN_FLEMING, 0.05, 2, _equal(3), "3.7103 2.5114 1.9930"),
    _Table(NO_PUBLICATION, COMPUTED, OBRIEN_FLEMING, 0.05, 2, _equal(4), "4.3326 2.9631 2.3590 2.0141"),
    _Table(LAN_DEMETS, REPRODUCED, OBRIEN_FLEMING, 0.05, 2, _equal(5), "4.8769 3.3569 2.6803 2.2898 2.0310"),
    _Table(
        NO_PUBLICATION,
        COMPUTED,
        OBRIEN_FLEMING,
        0.05,
        2,
        _equal(6),
        "5.3666 3.7103 2.9697 2.5387 2.2522 2.0448",
    ),
    _Table(
        NO_PUBLICATION,
        COMPUTED,
        OBRIEN_FLEMING,
        0.05,
        2,
        _equal(10),
        "6.991 4.877 3.930 3.367 2.989 2.715 2.504 2.336 2.198 2.081",
    ),
    # Pocock-type
    _Table(NO_PUBLICATION, COMPUTED, POCOCK, 0.05, 2, _equal(2), "2.1570 2.2010"),
    _Table(NO_PUBLICATION, COMPUTED, POCOCK, 0.05, 2, _equal(3), "2.2794 2.2949 2.2959"),
    _Table(NO_PUBLICATION, COMPUTED, POCOCK, 0.05, 2, _equal(4), "2.3683 2.3675 2.3582 2.3500"),
    _Table(LAN_DEMETS, REPRODUCED, POCOCK, 0.05, 2, _equal(5), "2.4380 2.4268 2.4101 2.3966 2.3859"),
    # power and Hwang-Shih-DeCani
    _Table(LAN_DEMETS, REPRODUCED, POWER, 0.05, 2, _equal(5), "2.58 2.49 2.41 2.34 2.28", key=1.0),
    *(
        _Table(NO_PUBLICATION, COMPUTED, spending, 0.05, 2, _equal(5), digits, key=key)
        for spending, key, digits in (
            (POWER, 1.0, "2.5758 2.4920 2.4108 2.3391 2.2755"),
            (POWER, 2.0, "3.0902 2.7141 2.4728 2.2799 2.1140"),
            (POWER, 3.0, "3.5401 2.9743 2.6045 2.3064 2.0455"),
            (HWANG_SHIH_DECANI, -4.0, "3.2527 2.9860 2.6917 2.3737 2.0253"),
            (HWANG_SHIH_DECANI, -2.0, "2.8903 2.7085 2.5141 2.3150 2.1100"),
            (HWANG_SHIH_DECANI, 1.0, "2.4487 2.4190 2.3984 2.3912 2.3948"),
        )
    ),
    # other levels
    _Table(NO_PUBLICATION, COMPUTED, OBRIEN_FLEMING, 0.01, 2, _equal(5), "6.168 4.287 3.444 2.947 2.615"),
    _Table(NO_PUBLICATION, COMPUTED, POCOCK, 0.01, 2, _equal(5), "2.973 2.990 2.992 2.992 2.991"),
    _Table(NO_PUBLICATION, COMPUTED, POCOCK, 0.2, 2, _equal(5), "1.8876 1.8238 1.7723 1.7324 1.7006"),
    # one side only
    _Table(
        NO_PUBLICATION, COMPUTED, OBRIEN_FLEMING, 0.025, 1, _equal(5), "4.8769 3.3570 2.6803 2.2898 2.0310"
    ),
    _Table(LAN_DEMETS_1983, REPRODUCED, OBRIEN_FLEMING, 0.025, 1, _equal(5), "4.90 3.35 2.68 2.29 2.03"),
    _Table(LAN_DEMETS_1983, REPRODUCED, POCOCK, 0.025, 1, _equal(5), "2.44 2.43 2.41 2.40 2.39"),
    # looks that do not fall evenly
    _Table(
        NO_PUBLICATION,
        COMPUTED,
        OBRIEN_FLEMING,
        0.025,
        1,
        (0.3, 0.6, 0.85, 1.0),
        "3.9286 2.6700 2.2010 2.0465",
    ),
    _Table(NO_PUBLICATION, COMPUTED, OBRIEN_FLEMING, 0.025, 1, (0.5, 0.75, 1.0), "2.9626 2.3590 2.0141"),
    _Table(NO_PUBLICATION, COMPUTED, POCOCK, 0.025, 1, (0.5, 0.75, 1.0), "2.1570 2.3124 2.3269"),
    _Table(
        NO_PUBLICATION,
        COMPUTED,
        HWANG_SHIH_DECANI,
        0.025,
        1,
        (0.5, 0.75, 1.0),
        "2.7500 2.4318 2.0116",
        key=-4.0,
    ),
    _Table(NO_PUBLICATION, COMPUTED, POWER, 0.025, 1, (0.5, 0.75, 1.0), "2.7344 2.3568 2.0285", key=3.0),
    _Table(NO_PUBLICATION, COMPUTED, OBRIEN_FLEMING, 0.025, 1, (0.35, 0.7, 1.0), "3.6128 2.4406 2.0002"),
    # the beta-blocker trial, by its deaths against two totals, and by its calendar
    _Table(
        BHAT,
        COMPUTED,
        OBRIEN_FLEMING,
        0.05,
        2,
        tuple(deaths / 628 for deaths in BHAT_DEATHS),
        "7.415 6.294 4.869 4.065 3.395 2.964",
        label="BHAT by deaths of 628",
    ),
    _Table(
        BHAT,
        COMPUTED,
        OBRIEN_FLEMING,
        0.05,
        2,
        tuple(deaths / 400 for deaths in BHAT_DEATHS),
        "5.877 4.977 3.827 3.182 2.644 2.305",
        label="BHAT by deaths of 400",
    ),
    _Table(
        BHAT,
        COMPUTED,
        OBRIEN_FLEMING,
        0.05,
        2,
        tuple(months / 48 for months in BHAT_MONTHS),
        "4.538 3.712 3.220 2.742 2.506 2.310",
        information=tuple(float(deaths) for deaths in BHAT_DEATHS),
        label="BHAT by calendar, correlations by deaths",
    ),
)

FIRST_LOOK = "a first bound is a plain normal quantile, so the quoted digits are in doubt"
KNOWN = {  # by publication, function, level and look
    (LAN_DEMETS, OBRIEN_FLEMING, 0.05, 2): _Known(1.5, LAST_DIGIT),
    (LAN_DEMETS, POCOCK, 0.05, 3): _Known(1.5, LAST_DIGIT),
    (LAN_DEMETS, POCOCK, 0.05, 5): _Known(1.5, LAST_DIGIT),
    (LAN_DEMETS_1983, OBRIEN_FLEMING, 0.025, 1): _Known(2.5, FIRST_LOOK),
    (LAN_DEMETS_1983, OBRIEN_FLEMING, 0.025, 2): _Known(1.5, LAST_DIGIT),
    (NO_PUBLICATION, POCOCK, 0.01, 1): _Known(0.6, FIRST_LOOK),
}

SPENDS = (
    (OBRIEN_FLEMING, _equal(5), "0.000001 0.000394 0.003808 0.012212 0.025"),
    (POCOCK, _equal(5), "0.007385 0.013078 0.017713 0.021621 0.025"),
    (OBRIEN_FLEMING, (0.3, 0.85), "0.000043 0.015051"),
)

REPEATED = (
    (0.05, (1, 2, 3, 4, 5, 10, 20, 50), "0.050 0.083 0.107 0.126 0.142 0.193 0.248 0.320"),
    (0.01, (1, 2, 3, 4, 5, 10, 20, 50), "0.010 0.018 0.024 0.029 0.033 0.047 0.064 0.088"),
)

NOMINAL = ((0.3, 0.6, 0.85, 1.0), "0.000043 0.003793 0.013869 0.020352")


def _bound_rows() -> list[PublishedRow]:
    return [_bound_row(table, look) for table in TABLES for look in range(len(table.fractions))]


def _bound_row(table: _Table, look: int) -> PublishedRow:
    known = KNOWN.get((table.publication, table.spending, table.alpha, look + 1), EXACT)
    return PublishedRow(
        quantity=f"{table.name}: look {look + 1}",
        publication=table.publication,
        mark="value from memory" if known.note and table.mark == REPRODUCED else table.mark,
        expected=table.digits.split()[look],
        compute=lambda: _bounds(table)[look],
        note=known.note,
        units=known.units,
    )


@lru_cache(maxsize=64)
def _bounds(table: _Table) -> tuple[float, ...]:
    """Bounds of one line of print, nothing final below full information."""
    information = table.information or table.fractions
    looks = starmap(_look, enumerate(zip(information, table.fractions, strict=True), start=1))
    bounds = bounds_ahead(EfficacyRule(table.function, table.sides, 1), (), tuple(looks))
    return tuple(_number(bound.efficacy_z) for bound in bounds)


def _look(number: int, clocks: tuple[float, float]) -> LookAhead:
    information, fraction = clocks
    return LookAhead(number, "planned", information, fraction, events=number, score_variance=1.0)


def _number(estimate: Estimate) -> float:
    if isinstance(estimate, Absent):
        raise ValueError(f"a check value needs a bound at every look: {estimate.reason}")
    return estimate


def _other_convention_rows() -> list[PublishedRow]:
    """The formula at the two-sided level, then halved: not what a plan here means, and visibly different."""
    return [
        _plain_row(
            f"O'Brien-Fleming-type formula at two-sided 0.05, then halved, 5 equal looks: look {look}",
            expected,
            _halved(look),
        )
        for look, expected in enumerate(["4.3826", "3.0997", "2.5534", "2.2538", "2.0635"], start=1)
    ]


def _halved(look: int) -> Callable[[], float]:
    return lambda: _halved_bounds()[look - 1]


@cache
def _halved_bounds() -> tuple[float, ...]:
    whole = spending_function(Efficacy(OBRIEN_FLEMING), 0.05)
    halved = SpendingFunction("halved", 0.025, lambda fraction, _: whole(fraction) / 2.0)
    looks = starmap(_look, enumerate(zip(_equal(5), _equal(5), strict=True), start=1))
    bounds = bounds_ahead(EfficacyRule(halved, 2, 1), (), tuple(looks))
    return tuple(_number(bound.efficacy_z) for bound in bounds)


def _spend_rows() -> list[PublishedRow]:
    """Cumulative alpha of one side at 0.025, and the nominal p of one plan's bounds."""
    spends = [
        _plain_row(f"{name} alpha spent of 0.025 by {fraction:g}", expected, _spent(name, fraction))
        for name, fractions, digits in SPENDS
        for fraction, expected in zip(fractions, digits.split(), strict=True)
    ]
    fractions, digits = NOMINAL
    nominal = [
        _plain_row(f"{OBRIEN_FLEMING} nominal one-sided p at {fraction:g}", expected, _nominal(look))
        for look, (fraction, expected) in enumerate(zip(fractions, digits.split(), strict=True))
    ]
    return spends + nominal


def _plain_row(quantity: str, expected: str, compute: Callable[[], float]) -> PublishedRow:
    return PublishedRow(quantity, NO_PUBLICATION, COMPUTED, expected, compute)


def _spent(name: str, fraction: float) -> Callable[[], float]:
    return lambda: spending_function(Efficacy(name), 0.025)(fraction)


def _nominal(look: int) -> Callable[[], float]:
    return lambda: _nominal_p(NOMINAL[0])[look]


def _nominal_p(fractions: Sequence[float]) -> tuple[float, ...]:
    spending = spending_function(Efficacy(OBRIEN_FLEMING), 0.025)
    looks = tuple(_look(number, (t, t)) for number, t in enumerate(fractions, start=1))
    bounds = bounds_ahead(EfficacyRule(spending, 1, 1), (), looks)
    return tuple(_number(bound.efficacy_p_one_sided) for bound in bounds)


def _repeated_test_rows() -> list[PublishedRow]:
    return [
        PublishedRow(
            quantity=f"type I error of {looks} equally spaced tests, each two-sided {level:g}",
            publication=REPEATED_TESTS,
            mark=REPRODUCED,
            expected=expected,
            compute=_repeated_error(looks, level),
        )
        for level, counts, digits in REPEATED
        for looks, expected in zip(counts, digits.split(), strict=True)
    ]


def _repeated_error(looks: int, level: float) -> Callable[[], float]:
    """Probability that any of the looks leaves (-c, c), c the fixed-sample critical value."""

    def compute() -> float:
        critical = float(-ndtri(level / 2.0))
        crossings = crossing_probabilities(_equal(looks), (Region(-critical, critical),) * looks)
        return float(crossings.upper.sum() + crossings.lower.sum())

    return compute
