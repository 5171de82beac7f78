"""Against lifelines, statsmodels and scikit-survival, live, on their own data sets and on random data.

These tests run in an environment of their own (tests/peers.lock), which holds numpy and scipy but nothing
else that the program needs: they also prove that app.survival needs no more. Closed forms agree to 1e-10,
what is iterated to 1e-6, as the libraries stop earlier than we do. Where one counts otherwise it is said how.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import lifelines
import numpy as np
import pandas as pd
import pytest
import sksurv.compare
import sksurv.datasets
import sksurv.linear_model
import sksurv.nonparametric
import statsmodels.api as sm
from lifelines import datasets, statistics
from lifelines.utils import restricted_mean_survival_time

from app import survival as s
from app.model.values import Absent, Bools, Floats

CLOSED = {"rel": 1e-10, "abs": 1e-12}
ITERATED = {"rel": 1e-6, "abs": 1e-6}
TO_THE_END = {
    "precision": 1e-13,
    "r_precision": 1e-16,
}  # its own rule stops 0.2% away on flat likelihoods


@dataclass(frozen=True, eq=False)
class Sample:
    time: Floats
    event: Bools
    arm: Bools
    x: Floats

    @property
    def two_arms(self) -> tuple[Floats, Bools, Bools]:
        return self.time, self.event, self.arm


def sample(time: object, event: object, arm: object, x: object) -> Sample:
    return Sample(
        np.asarray(time, dtype=float), np.asarray(event) > 0, np.asarray(arm) > 0, np.asarray(x, dtype=float)
    )


def random_sample(seed: int, size: int, *, days: bool) -> Sample:
    random = np.random.default_rng(seed)
    arm, x = random.random(size) < 0.5, random.normal(size=size)
    time = random.exponential(300 * np.exp(0.4 * arm - 0.3 * x))
    censored = random.uniform(50, 700, size)
    seen = np.minimum(time, censored)
    return sample(np.ceil(seen) if days else seen, time <= censored, arm, x)


@cache
def samples() -> dict[str, Sample]:
    rossi, waltons, larynx = datasets.load_rossi(), datasets.load_waltons(), datasets.load_larynx()
    gbsg, breast = sksurv.datasets.load_gbsg2()
    whas, attack = sksurv.datasets.load_whas500()
    lung, veterans = sksurv.datasets.load_veterans_lung_cancer()
    return {
        "rossi": sample(rossi.week, rossi.arrest, rossi.fin, rossi.age),
        "waltons": sample(waltons["T"], waltons.E, waltons.group == "control", waltons["T"] % 3),
        "larynx": sample(larynx.time, larynx.death, larynx.Stage_III + larynx.Stage_IV, larynx.age),
        "gbsg2": sample(breast["time"], breast["cens"], gbsg.horTh == "yes", gbsg.age),
        "whas500": sample(attack["lenfol"], attack["fstat"], whas.gender == "1", whas.age),
        "veterans": sample(
            veterans["Survival_in_days"],
            veterans["Status"],
            lung.Treatment == "test",
            lung.Karnofsky_score,
        ),
        "random days": random_sample(1, 400, days=True),
        "random": random_sample(2, 400, days=False),
        "random, large": random_sample(3, 5000, days=True),
    }


SETS = (
    "rossi",
    "waltons",
    "larynx",
    "gbsg2",
    "whas500",
    "veterans",
    "random days",
    "random",
    "random, large",
)
every_set = pytest.mark.parametrize("name", SETS)


def structured(of: Sample) -> np.ndarray:
    return np.array(list(zip(of.event, of.time, strict=True)), dtype=[("event", bool), ("time", float)])


def test_the_program_s_other_packages_are_not_here() -> None:
    assert pd.__version__ < "3"  # lifelines' own; the program's readers need a later one
    with pytest.raises(ModuleNotFoundError):
        import fastapi  # noqa: F401


@every_set
def test_curve(name: str) -> None:
    of = samples()[name]
    ours = s.kaplan_meier(of.time, of.event, interval="log-log")
    theirs = lifelines.KaplanMeierFitter().fit(of.time, of.event)
    survival = theirs.survival_function_at_times(ours.time).to_numpy()
    assert ours.survival.tolist() == pytest.approx(survival.tolist(), **CLOSED)
    time, survival, limits = sksurv.nonparametric.kaplan_meier_estimator(
        of.event, of.time, conf_type="log-log"
    )
    assert ours.time.tolist() == time.tolist()
    assert ours.survival.tolist() == pytest.approx(survival.tolist(), **CLOSED)
    inside = (ours.survival > 0) & (ours.survival < 1)
    assert ours.ci_low[inside].tolist() == pytest.approx(limits[0][inside].tolist(), **CLOSED)
    assert ours.ci_high[inside].tolist() == pytest.approx(limits[1][inside].tolist(), **CLOSED)
    stats = sm.SurvfuncRight(of.time, of.event.astype(int))
    at = np.searchsorted(ours.time, stats.surv_times)
    assert ours.survival[at].tolist() == pytest.approx(stats.surv_prob.tolist(), **CLOSED)
    known = ours.survival[at] > 0
    assert ours.std_error[at][known].tolist() == pytest.approx(stats.surv_prob_se[known].tolist(), **CLOSED)


@every_set
def test_median(name: str) -> None:
    of = samples()[name]
    ours = s.kaplan_meier(of.time, of.event).median
    theirs = lifelines.KaplanMeierFitter().fit(of.time, of.event).median_survival_time_
    if isinstance(ours, Absent):
        assert np.isinf(theirs)
    else:  # where the curve is flat at one half lifelines takes its start, we the middle
        assert ours == theirs or 0.5 in s.kaplan_meier(of.time, of.event).survival.round(8)


@every_set
def test_cumulative_hazard(name: str) -> None:
    of = samples()[name]
    ours = s.nelson_aalen(of.time, of.event)
    time, hazard = sksurv.nonparametric.nelson_aalen_estimator(of.event, of.time)
    assert ours.time.tolist() == time.tolist()
    assert ours.hazard.tolist() == pytest.approx(hazard.tolist(), **CLOSED)
    theirs = lifelines.NelsonAalenFitter(nelson_aalen_smoothing=False).fit(of.time, of.event)
    assert ours.hazard.tolist() == pytest.approx(
        theirs.cumulative_hazard_at_times(ours.time).tolist(), **CLOSED
    )


@every_set
def test_logrank(name: str) -> None:
    of = samples()[name]
    ours = s.logrank(*of.two_arms)
    theirs = statistics.logrank_test(of.time[of.arm], of.time[~of.arm], of.event[of.arm], of.event[~of.arm])
    assert ours.chi_square == pytest.approx(theirs.test_statistic, **CLOSED)
    assert ours.p_two_sided == pytest.approx(theirs.p_value, rel=1e-8)
    chi_square, p = sm.duration.survdiff(of.time, of.event.astype(int), of.arm.astype(int))
    assert [ours.chi_square, ours.p_two_sided] == pytest.approx([chi_square, p], rel=1e-8)
    chi_square, p = sksurv.compare.compare_survival(structured(of), of.arm.astype(int))
    assert [ours.chi_square, ours.p_two_sided] == pytest.approx([chi_square, p], rel=1e-8)


@every_set
def test_stratified_logrank(name: str) -> None:
    of = samples()[name]
    stratum = (of.x > np.median(of.x)).astype(int)
    chi_square, _ = sm.duration.survdiff(of.time, of.event.astype(int), of.arm.astype(int), strata=stratum)
    assert s.logrank(*of.two_arms, stratum=stratum).chi_square == pytest.approx(chi_square, rel=1e-8)


@every_set
@pytest.mark.parametrize(
    ("weight", "lifelines_name", "statsmodels_name"),
    [(s.GEHAN_BRESLOW, "wilcoxon", "gb"), (s.TARONE_WARE, "tarone-ware", "tw")],
    ids=["Gehan-Breslow", "Tarone-Ware"],
)
def test_weights_by_numbers_at_risk(
    name: str, weight: s.Weight, lifelines_name: str, statsmodels_name: str
) -> None:
    of = samples()[name]
    ours = s.weighted_logrank(*of.two_arms, weight=weight).chi_square
    theirs = statistics.logrank_test(
        of.time[of.arm], of.time[~of.arm], of.event[of.arm], of.event[~of.arm], weightings=lifelines_name
    )
    assert ours == pytest.approx(theirs.test_statistic, rel=1e-8)
    chi_square, _ = sm.duration.survdiff(
        of.time, of.event.astype(int), of.arm.astype(int), weight_type=statsmodels_name
    )
    assert ours == pytest.approx(chi_square, rel=1e-8)


@every_set
@pytest.mark.parametrize(("rho", "gamma"), [(1, 0), (0, 1), (1, 1), (0.5, 2)])
def test_fleming_harrington_weights(name: str, rho: float, gamma: float) -> None:
    of = samples()[name]
    theirs = statistics.logrank_test(
        of.time[of.arm],
        of.time[~of.arm],
        of.event[of.arm],
        of.event[~of.arm],
        weightings="fleming-harrington",
        p=rho,
        q=gamma,
    )
    ours = s.weighted_logrank(*of.two_arms, weight=s.fleming_harrington(rho, gamma))
    assert ours.chi_square == pytest.approx(theirs.test_statistic, rel=1e-8)


@every_set
def test_hazard_ratio(name: str) -> None:
    of = samples()[name]
    efron = s.cox_two_arms(*of.two_arms)
    frame = pd.DataFrame({"time": of.time, "event": of.event, "arm": of.arm.astype(float)})
    theirs = lifelines.CoxPHFitter().fit(frame, "time", "event", fit_options=TO_THE_END)
    assert efron.log_hazard_ratio == pytest.approx(theirs.params_["arm"], **ITERATED)
    assert efron.std_error == pytest.approx(theirs.standard_errors_["arm"], **ITERATED)
    for ties in ("Efron", "Breslow"):
        fit = sm.PHReg(of.time, of.arm.astype(float), status=of.event, ties=ties.lower()).fit(disp=0)
        ours = s.cox_two_arms(*of.two_arms, ties=ties)
        assert ours.log_hazard_ratio == pytest.approx(fit.params[0], **ITERATED)
        assert ours.std_error == pytest.approx(fit.bse[0], **ITERATED)


@every_set
def test_model_with_two_covariates(name: str) -> None:
    of = samples()[name]
    covariates = np.column_stack([of.arm.astype(float), of.x])
    ours = s.cox_regression(of.time, of.event, covariates)
    assert not isinstance(ours.estimate, Absent)
    model = sksurv.linear_model.CoxPHSurvivalAnalysis(ties="efron", tol=1e-12)
    theirs = model.fit(covariates, structured(of)).coef_
    assert ours.estimate.coefficients.tolist() == pytest.approx(theirs.tolist(), **ITERATED)
    frame = pd.DataFrame({"time": of.time, "event": of.event, "arm": covariates[:, 0], "x": of.x})
    fitted = lifelines.CoxPHFitter().fit(frame, "time", "event")
    assert ours.log_likelihood == pytest.approx(fitted.log_likelihood_, rel=1e-8)
    test = fitted.log_likelihood_ratio_test().test_statistic
    assert ours.likelihood_ratio.chi_square == pytest.approx(test, rel=1e-6, abs=1e-6)


@every_set
def test_restricted_mean(name: str) -> None:
    of = samples()[name]
    at = float(np.quantile(of.time, 0.7))
    theirs = restricted_mean_survival_time(lifelines.KaplanMeierFitter().fit(of.time, of.event), at)
    ours = s.restricted_mean(s.kaplan_meier(of.time, of.event), at)
    assert ours.mean == pytest.approx(theirs, rel=1e-8)


@every_set
def test_incidence_of_two_causes(name: str) -> None:
    of = samples()[name]
    cause = np.where(of.event, 1 + (of.x > np.median(of.x)), 0)
    time, incidence, _ = sksurv.nonparametric.cumulative_incidence_competing_risks(
        cause, of.time, conf_type="log-log", var_type="Dinse_Approx"
    )
    for of_cause in (1, 2):
        ours = s.cumulative_incidence(of.time, cause, of=of_cause)
        at = np.searchsorted(time, ours.time)
        assert ours.incidence.tolist() == pytest.approx(incidence[of_cause][at].tolist(), **CLOSED)


def test_proportionality_differs_from_the_older_approximation_as_is_known() -> None:
    # lifelines computes the test of 1994 with one average information; we, as R's survival from 3.0 on, the
    # score test itself: on the veterans' trial, identity transform, 4.914 against 2.196
    of = samples()["veterans"]
    frame = pd.DataFrame({"time": of.time, "event": of.event, "arm": of.arm.astype(float)})
    fitted = lifelines.CoxPHFitter().fit(frame, "time", "event")
    theirs = statistics.proportional_hazard_test(fitted, frame, time_transform="identity").test_statistic
    ours = s.proportionality(*of.two_arms, transform="identity").chi_square
    assert ours != pytest.approx(float(np.ravel(theirs)[0]), rel=0.05)
