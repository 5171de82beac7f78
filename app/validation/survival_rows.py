"""Published values of the survival estimators: curves, medians, log-rank and hazard ratios."""

from __future__ import annotations

from collections.abc import Callable, Iterable

import numpy as np

from app.model.survival import CoxResult, LogrankResult, SurvivalCurve
from app.model.values import Absent, Estimate
from app.survival import cox_two_arms, follow_up_median, kaplan_meier, logrank
from app.validation.rows import Mark, PublishedRow
from app.validation.samples import PublishedSample, published_sample

LEUKAEMIA = "Freireich et al. (1963), Blood 21, 699; Gehan (1965), Biometrika 52, 203: 6-MP against placebo"
CATHETERS = "Klein & Moeschberger (2003), Survival Analysis, 2nd ed., Tables 1.2 and 7.3"
STAINING = "Collett (2003), Modelling Survival Data in Medical Research, 2nd ed., Examples 2.12, 2.13, 3.1"

REPRODUCED: Mark = "value from memory, reproduced by computation"
INDEPENDENT: Mark = "computed independently"

# time, at risk, events, survival, standard error; weeks
CURVE_OF_6_MP = """
     6 21 3 0.857143 0.076360
     7 17 1 0.806723 0.086935
    10 15 1 0.752941 0.096350
    13 12 1 0.690196 0.106815
    16 11 1 0.627451 0.114054
    22  7 1 0.537815 0.128234
    23  6 1 0.448179 0.134592
"""
# time, survival; weeks
CURVE_OF_PLACEBO = """
     1 0.9048
     2 0.8095
     3 0.7619
     4 0.6667
     5 0.5714
     8 0.3810
    11 0.2857
    12 0.1905
    15 0.1429
    17 0.0952
    22 0.0476
    23 0
"""
# kind, lower and upper 95% limit of survival on 6-MP at 10 weeks
LIMITS_AT_TEN_WEEKS = """
    plain               0.5641 0.9418
    log                 0.5859 0.9676
    log-log             0.5032 0.8894
    logit               0.5248 0.8937
    arcsine-square-root 0.5462 0.9119
"""
# kind, lower 95% limit of the 6-MP median (the upper is not reached), limits of the placebo median; weeks
LIMITS_OF_MEDIANS = """
    plain   13 4 11
    log     16 4 12
    log-log 13 4 11
"""

LAST_DIGIT_DIFFERS = {
    "6-MP at 23 weeks, std error": "last digit: in exact fractions the root is 0.13459146, so 0.134591",
}


def survival_rows() -> tuple[PublishedRow, ...]:
    """Every published value of this module."""
    return (
        *_leukaemia_curves(),
        *_leukaemia_medians(),
        *_leukaemia_comparison(),
        *_leukaemia_pairs(),
        *_catheters(),
        *_staining(),
    )


Item = tuple[str, str, Callable[[], float]]


def _rows(publication: str, mark: Mark, items: Iterable[Item]) -> tuple[PublishedRow, ...]:
    return tuple(_row(publication, mark, *item) for item in items)


def _row(
    publication: str, mark: Mark, what: str, expected: str, compute: Callable[[], float]
) -> PublishedRow:
    """The row, with the note and the wider tolerance of those whose last digit differs."""
    note = LAST_DIGIT_DIFFERS.get(what, "")
    return PublishedRow(what, publication, mark, expected, compute, note, units=1.5 if note else 0.5)


def _fields(table: str) -> list[list[str]]:
    return [line.split() for line in table.strip().splitlines()]


def _curve(arm: str, interval: str = "log-log") -> SurvivalCurve:
    sample = published_sample("leukaemia_remission")
    chosen = sample.is_in(arm)
    return kaplan_meier(sample.time[chosen], sample.event[chosen], interval=interval)


def _at(arm: str, time: str, column: str, interval: str = "log-log") -> Callable[[], float]:
    """Reads one column of a curve at one of its times."""

    def read() -> float:
        curve = _curve(arm, interval)
        return float(getattr(curve, column)[np.flatnonzero(curve.time == float(time))[0]])

    return read


def _number(estimate: Estimate) -> float:
    """The estimate, which the publication says exists."""
    if isinstance(estimate, Absent):
        raise ValueError(f"a published value exists here, ours does not: {estimate.reason}")
    return estimate


def _leukaemia_curves() -> tuple[PublishedRow, ...]:
    columns = ("at_risk", "events", "survival", "std_error")
    of_6_mp = [
        (f"6-MP at {time} weeks, {column.replace('_', ' ')}", value, _at("6-MP", time, column))
        for time, *values in _fields(CURVE_OF_6_MP)
        for column, value in zip(columns, values, strict=True)
    ]
    of_placebo = [
        (f"placebo at {time} weeks, survival", value, _at("placebo", time, "survival"))
        for time, value in _fields(CURVE_OF_PLACEBO)
    ]
    limits = [
        (f"6-MP at 10 weeks, {kind} {end} 95% limit", value, _at("6-MP", "10", column, kind))
        for kind, *values in _fields(LIMITS_AT_TEN_WEEKS)
        for end, column, value in zip(("lower", "upper"), ("ci_low", "ci_high"), values, strict=True)
    ]
    return _rows(LEUKAEMIA, REPRODUCED, of_6_mp + of_placebo) + _rows(LEUKAEMIA, INDEPENDENT, limits)


def _median_limits(kind: str, of_6_mp: str, low: str, high: str) -> list[Item]:
    return [
        (f"6-MP median, lower {kind} limit", of_6_mp, lambda: _number(_curve("6-MP", kind).median_ci_low)),
        (f"placebo median, lower {kind} limit", low, lambda: _number(_curve("placebo", kind).median_ci_low)),
        (
            f"placebo median, upper {kind} limit",
            high,
            lambda: _number(_curve("placebo", kind).median_ci_high),
        ),
    ]


def _leukaemia_medians() -> tuple[PublishedRow, ...]:
    medians: list[Item] = [
        ("6-MP median, weeks", "23", lambda: _number(_curve("6-MP").median)),
        ("placebo median, weeks", "8", lambda: _number(_curve("placebo").median)),
        ("6-MP median follow-up, reverse Kaplan-Meier, weeks", "25", _follow_up_on_6_mp),
    ]
    limits = [item for fields in _fields(LIMITS_OF_MEDIANS) for item in _median_limits(*fields)]
    return _rows(LEUKAEMIA, INDEPENDENT, medians + limits)


def _follow_up_on_6_mp() -> float:
    sample = published_sample("leukaemia_remission")
    chosen = sample.is_in("6-MP")
    return _number(follow_up_median(sample.time[chosen], sample.event[chosen]))


def _logrank(sample: PublishedSample, experimental: str) -> LogrankResult:
    return logrank(sample.time, sample.event, sample.is_in(experimental))


def _cox(sample: PublishedSample, experimental: str, ties: str = "Efron") -> CoxResult:
    return cox_two_arms(sample.time, sample.event, sample.is_in(experimental), ties=ties)


def _leukaemia_comparison() -> tuple[PublishedRow, ...]:
    def test(experimental: str = "6-MP") -> LogrankResult:
        return _logrank(published_sample("leukaemia_remission"), experimental)

    def ratio(ties: str = "Efron") -> CoxResult:
        return _cox(published_sample("leukaemia_remission"), "6-MP", ties)

    def share(of: LogrankResult) -> float:
        return (of.observed - of.expected) ** 2 / of.expected

    printed: list[Item] = [
        ("log-rank, observed on 6-MP", "9", lambda: test().observed),
        ("log-rank, observed on placebo", "21", lambda: test("placebo").observed),
        ("log-rank, expected on 6-MP", "19.3", lambda: test().expected),
        ("log-rank, expected on placebo", "10.7", lambda: test("placebo").expected),
        ("log-rank, (O - E)^2 / E on 6-MP", "5.46", lambda: share(test())),
        ("log-rank, (O - E)^2 / E on placebo", "9.77", lambda: share(test("placebo"))),
        ("log-rank, chi-square", "16.8", lambda: test().chi_square),
        ("log-rank, two-sided p", "4.17e-05", lambda: test().p_two_sided),
        ("Cox, Breslow ties, log hazard ratio", "-1.509191", lambda: ratio("Breslow").log_hazard_ratio),
        ("Cox, Breslow ties, standard error", "0.409564", lambda: ratio("Breslow").std_error),
        ("Cox, Efron ties, log hazard ratio", "-1.572125", lambda: ratio().log_hazard_ratio),
        ("Cox, Efron ties, standard error", "0.412397", lambda: ratio().std_error),
        ("Cox, Efron ties, hazard ratio", "0.2076", lambda: ratio().hazard_ratio),
        ("Cox, Efron ties, lower 95% limit", "0.0925", lambda: ratio().ci_low),
        ("Cox, Efron ties, upper 95% limit", "0.4659", lambda: ratio().ci_high),
        (
            "Cox, Efron ties, Wald chi-square",
            "14.53",
            lambda: (ratio().log_hazard_ratio / ratio().std_error) ** 2,
        ),
    ]
    computed: list[Item] = [
        ("log-rank, expected on 6-MP", "19.250501", lambda: test().expected),
        ("log-rank, expected on placebo", "10.749499", lambda: test("placebo").expected),
        ("log-rank, variance", "6.256961", lambda: test().variance),
        ("log-rank, z, 6-MP experimental", "4.09792", lambda: test().z),
        ("log-rank, z, placebo experimental", "-4.09792", lambda: test("placebo").z),
        ("log-rank, chi-square", "16.79294", lambda: test().chi_square),
    ]
    return _rows(LEUKAEMIA, REPRODUCED, printed) + _rows(LEUKAEMIA, INDEPENDENT, computed)


def _leukaemia_pairs() -> tuple[PublishedRow, ...]:
    """Each pair a stratum: the test becomes the sign test, (18 - 3)^2 / 21, the ratio 3 / 18."""
    sample = published_sample("leukaemia_remission")
    arguments = (sample.time, sample.event, sample.is_in("6-MP"))
    items: list[Item] = [
        (
            "log-rank stratified by pair, chi-square",
            "10.714286",
            lambda: logrank(*arguments, stratum=sample.stratum).chi_square,
        ),
        (
            "Cox stratified by pair, log hazard ratio",
            "-1.7917595",
            lambda: cox_two_arms(*arguments, stratum=sample.stratum).log_hazard_ratio,
        ),
    ]
    return _rows(LEUKAEMIA, INDEPENDENT, items)


def _catheters() -> tuple[PublishedRow, ...]:
    def test() -> LogrankResult:
        return _logrank(published_sample("dialysis_catheters"), "surgical")

    printed: list[Item] = [
        ("log-rank, chi-square", "2.53", lambda: test().chi_square),
        ("log-rank, two-sided p", "0.112", lambda: test().p_two_sided),
    ]
    computed: list[Item] = [
        ("log-rank, observed - expected, surgical", "3.96355", lambda: test().observed - test().expected),
        ("log-rank, variance", "6.2106", lambda: test().variance),
    ]
    return _rows(CATHETERS, REPRODUCED, printed) + _rows(CATHETERS, INDEPENDENT, computed)


def _staining() -> tuple[PublishedRow, ...]:
    def test() -> LogrankResult:
        return _logrank(published_sample("breast_cancer_staining"), "positive")

    def ratio() -> CoxResult:
        return _cox(published_sample("breast_cancer_staining"), "positive", "Breslow")

    items: list[Item] = [
        ("log-rank, observed - expected, positive", "4.565", lambda: test().observed - test().expected),
        ("log-rank, variance", "5.929", lambda: test().variance),
        ("log-rank, chi-square", "3.515", lambda: test().chi_square),
        ("log-rank, two-sided p", "0.061", lambda: test().p_two_sided),
        ("Cox, Breslow ties, log hazard ratio", "0.9080", lambda: ratio().log_hazard_ratio),
        ("Cox, Breslow ties, standard error", "0.5009", lambda: ratio().std_error),
        ("Cox, Breslow ties, hazard ratio", "2.479", lambda: ratio().hazard_ratio),
    ]
    return _rows(STAINING, REPRODUCED, items)
