"""Check values beyond the plan's test: weighted tests, restricted means, landmarks, groups, models,
incidence.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import cache

import numpy as np

from app.model.survival import (
    CoxModel,
    LandmarkComparison,
    LogrankResult,
    RestrictedMeanComparison,
    SurvivalCurve,
)
from app.model.values import Absent, Estimate
from app.survival import (
    GEHAN_BRESLOW,
    LOG_RANK,
    MODIFIED_PETO_PETO,
    PETO_PETO,
    TARONE_WARE,
    Weight,
    cause_specific_ratio,
    compare_landmarks,
    compare_restricted_means,
    cox_regression,
    cox_two_arms,
    cumulative_incidence,
    fleming_harrington,
    gray_test,
    groups_logrank,
    kaplan_meier,
    kaplan_meier_by_arm,
    logrank,
    peto_one_step,
    pike_ratio,
    proportionality,
    trend_logrank,
    weighted_logrank,
    weighted_maximum,
)
from app.validation.rows import Mark, PublishedRow
from app.validation.samples import PublishedSample, published_causes, published_sample

REPRODUCED: Mark = "value from memory, reproduced by computation"
COMPUTED: Mark = "computed independently"

LEUKAEMIA = "Freireich et al. (1963), Blood 21, 699; Gehan (1965), Biometrika 52, 203: 6-MP against placebo"
CATHETERS = "Klein & Moeschberger (2003), Survival Analysis, 2nd ed., Tables 1.2 and 7.3"
STAINING = "Collett (2003), Modelling Survival Data in Medical Research, 2nd ed., Examples 2.12 and 2.13"
CIRRHOSIS = "Fleming & Harrington (1991), Appendix D; restricted means as in Uno et al. (2014), JCO 32, 2380"
LUNG = "Loprinzi et al. (1994), JCO 12, 601; computed with R's survival"
VETERANS = "Kalbfleisch & Prentice (1980); computed with R's survival"
OVARY = "Edmonson et al. (1979), Cancer Treatment Reports 63, 241; computed with R's survival"
GAMMOPATHY = "Kyle et al. (2002), NEJM 346, 564; computed with R's survival and cmprsk"

DAYS_PER_YEAR = 365.25

Item = tuple[str, str, Callable[[], float]]

WEIGHTS: dict[str, Weight] = {
    "log-rank": LOG_RANK,
    "Gehan-Breslow": GEHAN_BRESLOW,
    "Tarone-Ware": TARONE_WARE,
    "Peto-Peto": PETO_PETO,
    "modified-Peto-Peto": MODIFIED_PETO_PETO,
}
SHAPES = tuple(fleming_harrington(rho, gamma) for rho, gamma in ((0, 0), (1, 0), (0, 1), (1, 1)))

# weight, chi-square; leukaemia
LEUKAEMIA_WEIGHTED = """
    Gehan-Breslow 13.4579
    Tarone-Ware   15.1236
    Peto-Peto     14.0841
    1,0           14.4572
    0,1           13.0484
    1,1           12.7415
    0,0.5         14.1946
"""
# weight, chi-square, two-sided p; dialysis catheters
CATHETERS_WEIGHTED = """
    log-rank           2.53  0.112
    Gehan-Breslow      0.002 0.964
    Tarone-Ware        0.40  0.526
    Peto-Peto          1.40  0.237
    modified-Peto-Peto 1.28  0.259
    0,1                9.67  0.002
    1,0                1.39  0.239
    1,1                9.83  0.002
    0.5,0.5            9.28  0.002
    0.5,2              8.18  0.004
"""


def shape_rows() -> tuple[PublishedRow, ...]:
    """Every check value of this module."""
    return (
        *_rows(LEUKAEMIA, REPRODUCED, _leukaemia_reproduced()),
        *_rows(LEUKAEMIA, COMPUTED, _leukaemia_computed()),
        *_rows(CATHETERS, REPRODUCED, _weighted("dialysis_catheters", "surgical", CATHETERS_WEIGHTED)),
        *_rows(CATHETERS, COMPUTED, [_maximum("dialysis_catheters", "surgical", "0.0036")]),
        *_rows(STAINING, REPRODUCED, _staining()),
        *_rows(CIRRHOSIS, REPRODUCED, _cirrhosis_means()),
        *_rows(CIRRHOSIS, COMPUTED, _cirrhosis()),
        *_rows(LUNG, COMPUTED, _lung()),
        *_rows(VETERANS, COMPUTED, _veterans()),
        *_rows(OVARY, COMPUTED, _ovary()),
        *_rows(GAMMOPATHY, COMPUTED, _gammopathy()),
    )


def _rows(publication: str, mark: Mark, items: list[Item]) -> list[PublishedRow]:
    return [PublishedRow(what, publication, mark, expected, compute) for what, expected, compute in items]


def _fields(table: str) -> list[list[str]]:
    return [line.split() for line in table.strip().splitlines()]


def _number(estimate: Estimate) -> float:
    """The estimate, which the reference says exists."""
    if isinstance(estimate, Absent):
        raise ValueError(f"a reference value exists here, ours does not: {estimate.reason}")
    return estimate


def _weight(name: str) -> Weight:
    """By name, or Fleming-Harrington's by its two exponents."""
    return WEIGHTS[name] if name in WEIGHTS else fleming_harrington(*map(float, name.split(",")))


def _weighted(name: str, arm: str, table: str) -> list[Item]:
    sample = published_sample(name)

    def read(weight: str, column: str) -> Callable[[], float]:
        return lambda: getattr(
            weighted_logrank(sample.time, sample.event, sample.is_in(arm), weight=_weight(weight)), column
        )

    return [
        (f"{weight} weighted test, {column.replace('_', ' ')}", value, read(weight, column))
        for weight, *values in _fields(table)
        for column, value in zip(("chi_square", "p_two_sided"), values, strict=False)
    ]


def _maximum(name: str, arm: str, expected: str) -> Item:
    sample = published_sample(name)
    return (
        "largest of Fleming-Harrington (0, 0), (1, 0), (0, 1), (1, 1), two-sided p",
        expected,
        lambda: weighted_maximum(sample.time, sample.event, sample.is_in(arm), weights=SHAPES).p_two_sided,
    )


@cache
def _curves(name: str, experimental: str, interval: str = "log-log") -> tuple[SurvivalCurve, SurvivalCurve]:
    sample = published_sample(name)
    arm = sample.is_in(experimental)
    return kaplan_meier_by_arm(sample.time, sample.event, arm, interval=interval)


def _leukaemia_logrank() -> LogrankResult:
    sample = published_sample("leukaemia_remission")
    return logrank(sample.time, sample.event, sample.is_in("6-MP"))


def _leukaemia_model(ties: str = "Efron") -> CoxModel:
    sample = published_sample("leukaemia_remission")
    return cox_regression(sample.time, sample.event, sample.is_in("6-MP"), ties=ties)


def _wald(model: CoxModel) -> float:
    if isinstance(model.wald, Absent):
        raise ValueError(model.wald.reason)
    return model.wald.chi_square


def _leukaemia_reproduced() -> list[Item]:
    sample = published_sample("leukaemia_remission")
    arguments = (sample.time, sample.event, sample.is_in("6-MP"))
    return [
        (
            "Cox, Efron ties, likelihood-ratio test",
            "16.3517",
            lambda: _leukaemia_model().likelihood_ratio.chi_square,
        ),
        ("Cox, Efron ties, Wald test of the model", "14.53", lambda: _wald(_leukaemia_model())),
        ("Cox, Efron ties, score test", "17.2465", lambda: _leukaemia_model().score.chi_square),
        (
            "Cox, exact ties, log hazard ratio",
            "-1.628244",
            lambda: cox_two_arms(*arguments, ties="exact").log_hazard_ratio,
        ),
        (
            "Cox, exact ties, standard error",
            "0.433131",
            lambda: cox_two_arms(*arguments, ties="exact").std_error,
        ),
        ("Cox, exact ties, score test", "16.7929", lambda: _leukaemia_model("exact").score.chi_square),
    ]


def _leukaemia_computed() -> list[Item]:
    sample = published_sample("leukaemia_remission")
    arguments = (sample.time, sample.event, sample.is_in("6-MP"))

    def gehan(column: str) -> float:
        return abs(float(getattr(weighted_logrank(*arguments, weight=GEHAN_BRESLOW), column)))

    return [
        *_weighted("leukaemia_remission", "6-MP", LEUKAEMIA_WEIGHTED),
        ("Gehan-Breslow score, absolute", "271", lambda: gehan("score")),
        ("Gehan-Breslow variance", "5457.11", lambda: gehan("variance")),
        *(
            (f"{weight.name}, z", value, lambda weight=weight: weighted_logrank(*arguments, weight=weight).z)
            for weight, value in zip(SHAPES, ("4.0979", "3.8023", "3.6123", "3.5695"), strict=True)
        ),
        (
            "proportionality, km transform, chi-square",
            "0.02286",
            lambda: proportionality(*arguments).chi_square,
        ),
        ("proportionality, km transform, p", "0.8798", lambda: proportionality(*arguments).p),
        *_leukaemia_ratios(),
        *_leukaemia_restricted(),
        *_leukaemia_landmark(),
    ]


def _leukaemia_ratios() -> list[Item]:
    return [
        ("Peto one-step hazard ratio", "0.19432", lambda: peto_one_step(_leukaemia_logrank()).hazard_ratio),
        ("Peto one-step, lower 95% limit", "0.08876", lambda: peto_one_step(_leukaemia_logrank()).ci_low),
        ("Peto one-step, upper 95% limit", "0.42541", lambda: peto_one_step(_leukaemia_logrank()).ci_high),
        ("Pike hazard ratio", "0.23931", lambda: pike_ratio(_leukaemia_logrank()).hazard_ratio),
    ]


def _leukaemia_restricted() -> list[Item]:
    def means() -> RestrictedMeanComparison:
        return compare_restricted_means(*_curves("leukaemia_remission", "6-MP"), 21.0)

    return [
        ("restricted mean to 21 weeks, 6-MP", "16.74398", lambda: means().experimental.mean),
        (
            "restricted mean to 21 weeks, 6-MP, standard error",
            "1.35497",
            lambda: means().experimental.std_error,
        ),
        ("restricted mean to 21 weeks, placebo", "8.52381", lambda: means().control.mean),
        (
            "restricted mean to 21 weeks, placebo, standard error",
            "1.31038",
            lambda: means().control.std_error,
        ),
        ("restricted mean to 21 weeks, difference", "8.22017", lambda: means().difference),
        ("restricted mean to 21 weeks, difference, standard error", "1.88495", lambda: means().std_error),
        ("restricted mean to 21 weeks, z", "4.361", lambda: means().z),
    ]


def _leukaemia_landmark() -> list[Item]:
    def landmark() -> LandmarkComparison:
        return compare_landmarks(*_curves("leukaemia_remission", "6-MP"), 10.0)

    def log_log() -> float:
        return next(_number(test.chi_square) for test in landmark().tests if test.scale == "log-log")

    return [
        ("survival at 10 weeks, difference", "0.37199", lambda: _number(landmark().difference)),
        (
            "survival at 10 weeks, difference, standard error",
            "0.14322",
            lambda: _number(landmark().std_error),
        ),
        ("survival at 10 weeks, log(-log) test, chi-square", "5.23089", log_log),
    ]


def _staining() -> list[Item]:
    sample = published_sample("breast_cancer_staining")

    def gehan(column: str) -> float:
        arm = sample.is_in("positive")
        return float(getattr(weighted_logrank(sample.time, sample.event, arm, weight=GEHAN_BRESLOW), column))

    return [
        ("Gehan-Breslow (Wilcoxon) score, positive", "159", lambda: gehan("score")),
        ("Gehan-Breslow (Wilcoxon) variance", "6048.14", lambda: gehan("variance")),
        ("Gehan-Breslow (Wilcoxon) chi-square", "4.180", lambda: gehan("chi_square")),
    ]


def _in_years(name: str) -> PublishedSample:
    sample = published_sample(name)
    return PublishedSample(sample.time / DAYS_PER_YEAR, sample.event, sample.arm, sample.stratum)


@cache
def _cirrhosis_compared() -> RestrictedMeanComparison:
    sample = _in_years("primary_biliary_cirrhosis")
    treated = sample.is_in("D-penicillamine")
    return compare_restricted_means(*kaplan_meier_by_arm(sample.time, sample.event, treated), 10.0)


def _cirrhosis_means() -> list[Item]:
    def ratio(end: str) -> float:
        found = _cirrhosis_compared().ratio
        if isinstance(found, Absent):
            raise ValueError(found.reason)
        return float(getattr(found, end))

    compared = _cirrhosis_compared
    return [
        ("restricted mean to 10 years, D-penicillamine", "7.146", lambda: compared().experimental.mean),
        ("the same, standard error", "0.283", lambda: compared().experimental.std_error),
        ("restricted mean to 10 years, placebo", "7.283", lambda: compared().control.mean),
        ("placebo, standard error", "0.295", lambda: compared().control.std_error),
        ("restricted means, difference", "-0.137", lambda: compared().difference),
        ("difference, lower 95% limit", "-0.939", lambda: compared().ci_low),
        ("difference, upper 95% limit", "0.665", lambda: compared().ci_high),
        ("difference, two-sided p", "0.738", lambda: compared().p_two_sided),
        ("restricted means, ratio", "0.981", lambda: ratio("ratio")),
        ("ratio, lower 95% limit", "0.878", lambda: ratio("ci_low")),
        ("ratio, upper 95% limit", "1.096", lambda: ratio("ci_high")),
    ]


def _cirrhosis() -> list[Item]:
    sample = published_sample("primary_biliary_cirrhosis")
    arguments = (sample.time, sample.event, sample.is_in("D-penicillamine"))
    return [
        ("log-rank, chi-square", "0.10171", lambda: logrank(*arguments).chi_square),
        ("Cox, Efron ties, hazard ratio", "1.0589", lambda: cox_two_arms(*arguments).hazard_ratio),
    ]


def _known_strata(sample: PublishedSample) -> np.ndarray:
    return np.flatnonzero(sample.stratum >= 0)


def _lung() -> list[Item]:
    sample = published_sample("lung_cancer")
    arm = sample.is_in("female")
    rows = _known_strata(sample)
    ambulant = np.flatnonzero((sample.stratum >= 0) & (sample.stratum <= 2))
    groups = (sample.time[ambulant], sample.event[ambulant], sample.stratum[ambulant])

    def test() -> LogrankResult:
        return logrank(sample.time, sample.event, arm)

    def curve(women: bool) -> SurvivalCurve:
        chosen = np.flatnonzero(arm == women)
        return kaplan_meier(sample.time[chosen], sample.event[chosen], interval="log")

    def stratified() -> float:
        return logrank(
            sample.time[rows], sample.event[rows], arm[rows], stratum=sample.stratum[rows]
        ).chi_square

    return [
        ("log-rank by sex, chi-square", "10.32674", lambda: test().chi_square),
        ("log-rank, expected, men", "91.58174", lambda: 165.0 - test().expected),
        ("log-rank, expected, women", "73.41826", lambda: test().expected),
        ("log-rank, variance", "40.37143", lambda: test().variance),
        (
            "Cox, Efron ties, hazard ratio",
            "0.5880",
            lambda: cox_two_arms(sample.time, sample.event, arm).hazard_ratio,
        ),
        (
            "Cox, log hazard ratio",
            "-0.5310",
            lambda: cox_two_arms(sample.time, sample.event, arm).log_hazard_ratio,
        ),
        ("Cox, standard error", "0.1672", lambda: cox_two_arms(sample.time, sample.event, arm).std_error),
        ("median, men, days", "270", lambda: _number(curve(False).median)),
        ("median, men, lower log limit", "212", lambda: _number(curve(False).median_ci_low)),
        ("median, men, upper log limit", "310", lambda: _number(curve(False).median_ci_high)),
        ("median, women, days", "426", lambda: _number(curve(True).median)),
        ("median, women, lower log limit", "348", lambda: _number(curve(True).median_ci_low)),
        ("median, women, upper log limit", "550", lambda: _number(curve(True).median_ci_high)),
        ("log-rank by sex, stratified by performance, chi-square", "10.79506", stratified),
        _maximum("lung_cancer", "female", "9.84e-4"),
        ("performance 0, 1, 2, log-rank of 3 groups", "18.0121", lambda: groups_logrank(*groups).chi_square),
        ("performance 0, 1, 2, trend", "16.4465", lambda: trend_logrank(*groups).chi_square),
    ]


def _veterans() -> list[Item]:
    sample = published_sample("lung_cancer_veterans")
    arguments = (sample.time, sample.event, sample.is_in("test"))
    groups = (sample.time, sample.event, sample.stratum)
    return [
        ("cell type, log-rank of 4 groups", "25.4037", lambda: groups_logrank(*groups).chi_square),
        ("log-rank by treatment, chi-square", "0.008227", lambda: logrank(*arguments).chi_square),
        (
            "log-rank by treatment, stratified by cell type",
            "0.70174",
            lambda: logrank(*arguments, stratum=sample.stratum).chi_square,
        ),
    ]


def _ovary() -> list[Item]:
    sample = published_sample("ovarian_cancer")
    arguments = (sample.time, sample.event, sample.is_in("two"))
    return [
        ("log-rank by treatment, chi-square", "1.06274", lambda: logrank(*arguments).chi_square),
        (
            "log-rank by treatment, stratified by residual disease",
            "1.27964",
            lambda: logrank(*arguments, stratum=sample.stratum).chi_square,
        ),
    ]


def _gammopathy() -> list[Item]:
    sample = published_causes("monoclonal_gammopathy")
    men = sample.is_in("men")
    malignancy, death = 1, 2

    def at(months: float, column: str) -> Callable[[], float]:
        def read() -> float:
            incidence = cumulative_incidence(sample.time, sample.cause, of=malignancy)
            index = int(np.searchsorted(incidence.time, months, side="right")) - 1
            return float(getattr(incidence, column)[index])

        return read

    def gray(of: int, column: str) -> Callable[[], float]:
        return lambda: float(getattr(gray_test(sample.time, sample.cause, men, of=of), column))

    return [
        ("incidence of malignancy at 60 months", "0.03410", at(60, "incidence")),
        ("incidence of malignancy at 120 months", "0.06372", at(120, "incidence")),
        ("incidence of malignancy at 240 months", "0.09981", at(240, "incidence")),
        ("incidence at 60 months, standard error", "0.00489", at(60, "std_error")),
        ("incidence at 120 months, standard error", "0.00680", at(120, "std_error")),
        ("incidence at 240 months, standard error", "0.00978", at(240, "std_error")),
        ("Gray's test by sex, malignancy", "1.1945", gray(malignancy, "chi_square")),
        ("Gray's test by sex, malignancy, p", "0.274", gray(malignancy, "p")),
        ("Gray's test by sex, death", "11.6513", gray(death, "chi_square")),
        (
            "cause-specific hazard ratio of malignancy, men against women",
            "0.9423",
            lambda: cause_specific_ratio(sample.time, sample.cause, men, of=malignancy).hazard_ratio,
        ),
    ]
