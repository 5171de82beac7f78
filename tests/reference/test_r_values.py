"""Against R's survival and cmprsk on twelve open data sets: r_values.R wrote what they compute.

Closed forms agree to 1e-10. What R iterates stops at a relative change of 1e-12 of the log-likelihood, that
is about 1e-6 of a standard error from the root, so estimates agree to 1e-8 where that error allows.
"""

from __future__ import annotations

import csv
from collections import defaultdict
from dataclasses import dataclass
from functools import cache
from pathlib import Path

import numpy as np
import pytest

from app import survival as s
from app.model.survival import SurvivalCurve
from app.model.values import Absent, Bools, Estimate, Floats, Ints

HERE = Path(__file__).parent
CLOSED = {"rel": 1e-10, "abs": 1e-13}
ITERATED = {"rel": 1e-8, "abs": 1e-9}
KINDS = ("plain", "log", "log-log", "logit", "arcsine-square-root")
TRANSFORMS = ("identity", "log", "rank", "km")


@dataclass(frozen=True, eq=False)
class Sample:
    time: Floats
    event: Bools
    arm: Bools
    stratum: Ints
    x: Floats

    @property
    def two_arms(self) -> tuple[Floats, Bools, Bools]:
        return self.time, self.event, self.arm


def rows(name: str) -> list[dict[str, str]]:
    with (HERE / name).open(newline="") as file:
        return list(csv.DictReader(file))


@cache
def samples() -> dict[str, Sample]:
    by_set = defaultdict(list)
    for row in rows("r_samples.csv"):
        by_set[row["set"]].append(row)
    return {
        name: Sample(
            time=np.array([float(row["time"]) for row in part]),
            event=np.array([row["event"] == "1" for row in part]),
            arm=np.array([row["arm"] == "1" for row in part]),
            stratum=np.array([int(row["stratum"]) for row in part]),
            x=np.array([float(row["x"]) for row in part]),
        )
        for name, part in by_set.items()
    }


@cache
def values() -> dict[tuple[str, str], list[float]]:
    found = defaultdict(list)
    for row in rows("r_values.csv"):
        found[row["set"], row["what"]].append(float(row["value"]) if row["value"] != "NA" else np.nan)
    return found


SETS = (
    "aml",
    "lung",
    "veteran",
    "ovarian",
    "pbc",
    "kidney",
    "colon",
    "gbsg",
    "rats",
    "stanford2",
    "retinopathy",
    "mgus2",
)
every_set = pytest.mark.parametrize("name", SETS)


def test_the_data_sets_are_the_twelve() -> None:
    assert tuple(samples()) == SETS
    assert all(sample.time.size >= 23 for sample in samples().values())


def number(estimate: Estimate) -> float:
    """R's NA for what does not exist."""
    return np.nan if isinstance(estimate, Absent) else estimate


def curve(name: str, arm: int, interval: str = "log-log") -> SurvivalCurve:
    sample = samples()[name]
    inside = np.flatnonzero(sample.arm == bool(arm))
    return s.kaplan_meier(sample.time[inside], sample.event[inside], interval=interval)


@every_set
@pytest.mark.parametrize("arm", [0, 1])
def test_curve_and_cumulative_hazard(name: str, arm: int) -> None:
    found, sample = curve(name, arm), samples()[name]
    inside = np.flatnonzero(sample.arm == bool(arm))
    hazard = s.nelson_aalen(sample.time[inside], sample.event[inside])
    at = np.searchsorted(found.time, values()[name, f"time.arm{arm}"])
    for what, column in (
        ("at_risk", found.at_risk),
        ("survival", found.survival),
        ("std_error", found.std_error),
        ("hazard", hazard.hazard),
        ("hazard_std_error", hazard.std_error),
    ):
        assert column[at].tolist() == pytest.approx(values()[name, f"{what}.arm{arm}"], nan_ok=True, **CLOSED)


@every_set
@pytest.mark.parametrize("arm", [0, 1])
@pytest.mark.parametrize("kind", KINDS)
def test_limits_and_quantiles(name: str, arm: int, kind: str) -> None:
    found = curve(name, arm, kind)
    at = np.searchsorted(found.time, values()[name, f"time.arm{arm}"])
    inside = found.survival[at] > 0.0  # R puts limits at survival 0, where there is no standard error
    for end in ("ci_low", "ci_high"):
        theirs = np.array(values()[name, f"{end}.{kind}.arm{arm}"])[inside]
        assert getattr(found, end)[at][inside].tolist() == pytest.approx(theirs.tolist(), **CLOSED)
    for share in (0.25, 0.5):
        ours = s.quantile(found, share)
        theirs = values()[name, f"quantile.{share}.{kind}.arm{arm}"]
        limits = [number(ours.time), number(ours.ci_low), number(ours.ci_high)]
        assert limits == pytest.approx(theirs, nan_ok=True, **CLOSED)


@every_set
@pytest.mark.parametrize("arm", [0, 1])
def test_restricted_mean_and_follow_up(name: str, arm: int) -> None:
    at, mean, error = values()[name, f"restricted_mean.arm{arm}"]
    found = s.restricted_mean(curve(name, arm), at)
    assert [found.mean, found.std_error] == pytest.approx([mean, error], **CLOSED)
    sample = samples()[name]
    inside = np.flatnonzero(sample.arm == bool(arm))
    ours = number(s.follow_up_median(sample.time[inside], sample.event[inside]))
    assert [ours] == pytest.approx(values()[name, f"follow_up.arm{arm}"], nan_ok=True)


@every_set
def test_logrank_plain_weighted_and_stratified(name: str) -> None:
    sample = samples()[name]
    test = s.logrank(*sample.two_arms)
    ours = [test.observed, test.expected, test.variance, test.chi_square]
    assert ours == pytest.approx(values()[name, "logrank.rho0"], **CLOSED)
    stratified = s.logrank(*sample.two_arms, stratum=sample.stratum)
    ours = [stratified.observed, stratified.expected, stratified.variance, stratified.chi_square]
    assert ours == pytest.approx(values()[name, "logrank.stratified"], **CLOSED)
    # rho = 1 in R is the member (1, 0) of Fleming-Harrington's family
    weighted = s.weighted_logrank(*sample.two_arms, weight=s.fleming_harrington(1, 0))
    observed, expected, variance, chi_square = values()[name, "logrank.rho1"]
    ours = [weighted.score, weighted.variance, weighted.chi_square]
    assert ours == pytest.approx([observed - expected, variance, chi_square], rel=1e-9)


@every_set
def test_several_groups_and_trend(name: str) -> None:
    sample = samples()[name]
    chi_square, degrees, *both = values()[name, "groups"]
    codes = np.unique(2 * sample.stratum + sample.arm, return_inverse=True)[1]
    ours = s.groups_logrank(sample.time, sample.event, codes)
    assert ours.degrees_of_freedom == degrees
    assert ours.chi_square == pytest.approx(chi_square, **CLOSED)
    assert [*ours.observed, *ours.expected] == pytest.approx(both, **CLOSED)
    trend = s.trend_logrank(sample.time, sample.event, sample.stratum - sample.stratum.min())
    assert [trend.chi_square] == pytest.approx(values()[name, "trend"], **CLOSED)


@every_set
@pytest.mark.parametrize("ties", ["Efron", "Breslow", "exact"])
def test_hazard_ratio_of_two_arms(name: str, ties: str) -> None:
    sample = samples()[name]
    ours = s.cox_two_arms(*sample.two_arms, stratum=sample.stratum, ties=ties)
    theirs = values()[name, f"cox.{ties.lower()}"]
    assert [ours.log_hazard_ratio, ours.std_error] == pytest.approx(theirs, **ITERATED)


@every_set
@pytest.mark.parametrize("ties", ["Efron", "Breslow", "exact"])
def test_model_with_a_covariate_and_strata(name: str, ties: str) -> None:
    sample = samples()[name]
    covariates = np.column_stack([sample.arm, sample.x])
    model = s.cox_regression(sample.time, sample.event, covariates, stratum=sample.stratum, ties=ties)
    assert not isinstance(model.estimate, Absent)
    assert not isinstance(model.wald, Absent)
    ours = [
        *model.estimate.coefficients,
        *model.estimate.covariance.ravel(),
        model.log_likelihood_at_zero,
        model.log_likelihood,
        model.score.chi_square,
        model.wald.chi_square,
    ]
    assert ours == pytest.approx(values()[name, f"model.{ties.lower()}"], **ITERATED)


@every_set
def test_baseline_hazard(name: str) -> None:
    sample = samples()[name]
    covariates = np.column_stack([sample.arm, sample.x])
    model = s.cox_regression(sample.time, sample.event, covariates)
    assert not isinstance(model.estimate, Absent)
    ours = s.baseline_hazard(sample.time, sample.event, covariates, model.estimate.coefficients)
    mean, last, hazard = values()[name, "baseline"]
    assert ours.at[1] == pytest.approx(mean, rel=1e-12)
    assert ours.time[-1] <= last
    # R leaves a covariate of two values where it is: its centre of `arm` is 0
    at_control = ours.cumulative[-1] * np.exp(-model.estimate.coefficients[0] * ours.at[0])
    assert min(abs(one / hazard - 1) for one in (ours.cumulative[-1], at_control)) < 1e-7


@every_set
@pytest.mark.parametrize("transform", TRANSFORMS)
def test_proportionality(name: str, transform: str) -> None:
    sample = samples()[name]
    ours = s.proportionality(*sample.two_arms, transform=transform)
    assert [ours.chi_square, ours.p] == pytest.approx(
        values()[name, f"proportionality.{transform}"], rel=1e-6, abs=1e-8
    )
    ours = s.proportionality(*sample.two_arms, stratum=sample.stratum, transform=transform)
    theirs = values()[name, f"proportionality.stratified.{transform}"]
    assert [ours.chi_square] == pytest.approx(theirs, rel=1e-6, abs=1e-8)
    covariates = np.column_stack([sample.arm, sample.x])
    tests = s.proportionality_tests(sample.time, sample.event, covariates, transform=transform)
    chi_squares = [*(one.chi_square for one in tests.covariates), tests.together.chi_square]
    theirs = values()[name, f"proportionality.model.{transform}"]
    assert chi_squares == pytest.approx(theirs, rel=1e-6, abs=1e-8)


@every_set
def test_scaled_residuals_and_their_smooth(name: str) -> None:
    sample = samples()[name]
    ours = s.scaled_residuals(sample.time, sample.event, sample.arm)
    theirs = values()[name, "residuals"]
    assert ours.on_scale[:6].tolist() == pytest.approx(theirs[:6], **CLOSED)
    # events at one time stand in no order
    first = ours.on_scale[:6] < ours.on_scale[5] if ours.on_scale[5] == ours.on_scale[6] else slice(0, 6)
    assert sorted(ours.residuals[:6, 0][first]) == pytest.approx(
        sorted(np.array(theirs[6:])[first]), rel=1e-7, abs=1e-7
    )
    assert [ours.residuals.sum()] == pytest.approx(values()[name, "residual_sum"], rel=1e-7, abs=1e-6)
    smooth = ours.smooth[0]
    assert not isinstance(smooth, Absent)
    at = [0, 9, 19, 29, 39]
    assert smooth.value[at].tolist() == pytest.approx(values()[name, "smooth"], rel=1e-6, abs=1e-7)
    assert smooth.std_error[at].tolist() == pytest.approx(values()[name, "smooth_std_error"], rel=1e-6)
    ratio, theirs = s.hazard_ratio_over_time(ours), np.array(values()[name, "smooth"])
    reach = 1.959963984540054 * np.array(values()[name, "smooth_std_error"])  # of the normal distribution
    assert ratio.ci_low[at].tolist() == pytest.approx(np.exp(theirs - reach), rel=1e-5)
    assert ratio.hazard_ratio[at].tolist() == pytest.approx(np.exp(theirs), rel=1e-5)
    assert ratio.ci_high[at].tolist() == pytest.approx(np.exp(theirs + reach), rel=1e-5)


@every_set
def test_periods_and_interaction(name: str) -> None:
    sample = samples()[name]
    cut = values()[name, "period1"][0]
    periods = s.period_ratios(*sample.two_arms, cuts=[cut])
    for number_of, period in enumerate(periods, start=1):
        assert not isinstance(period.ratio, Absent)
        ours = [period.ratio.log_hazard_ratio, period.ratio.std_error]
        assert ours == pytest.approx(values()[name, f"period{number_of}"][1:], **ITERATED)
    chi_square, degrees = values()[name, "interaction"]
    test = s.interaction(*sample.two_arms, sample.stratum).likelihood_ratio
    assert test.degrees_of_freedom == degrees
    assert test.chi_square == pytest.approx(chi_square, rel=1e-7, abs=1e-9)


@cache
def causes() -> tuple[Floats, Ints, Ints, Ints]:
    table = rows("r_causes.csv")
    months = np.array([float(row["months"]) for row in table])
    return months, *(np.array([int(row[name]) for row in table]) for name in ("cause", "men", "old"))


@pytest.mark.parametrize("of", [1, 2])
def test_cumulative_incidence(of: int) -> None:
    time, cause, _, _ = causes()
    ours = s.cumulative_incidence(time, cause, of=of)
    at = np.searchsorted(ours.time, [12, 60, 120, 240, 360], side="right") - 1
    assert ours.incidence[at].tolist() == pytest.approx(values()["mgus2", f"incidence.{of}"], **CLOSED)
    assert ours.std_error[at].tolist() == pytest.approx(
        values()["mgus2", f"incidence_std_error.{of}"], rel=1e-9
    )


@pytest.mark.parametrize("of", [1, 2])
def test_gray_s_test(of: int) -> None:
    time, cause, men, old = causes()
    ours = [
        s.gray_test(time, cause, men, of=of).chi_square,
        s.gray_test(time, cause, old, of=of).chi_square,
        s.gray_test(time, cause, men, of=of, stratum=old).chi_square,
    ]
    theirs = [values()["mgus2", f"gray.{kind}"][of - 1] for kind in ("two", "four", "stratified")]
    assert ours == pytest.approx(theirs, **CLOSED)
