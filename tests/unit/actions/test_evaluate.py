"""Looks evaluated without a trial file: published numbers, and the same as through the file."""

from __future__ import annotations

import csv
import io
import re
from pathlib import Path
from typing import Any

import pytest

from app.actions.calculate import LookGiven, boundary, evaluate
from app.actions.desk import UploadedFile
from app.actions.looks import record_of
from app.errors import AppError
from app.record.schema import BOUNDARY_RECORD, EVALUATION_RECORD, differences
from app.review.received import SnapshotBlocked
from app.verification.assembly import frozen_record
from tests.unit.actions.invented_file import desk, held, settings
from tests.unit.review.invented_trial import CUTOFFS, patients, plan_text

# Freireich et al. (1963), Blood 21, 699-716; Gehan (1965), Biometrika 52, 203-223: weeks; + is censored
SIX_MP = re.findall(r"\d+\+?", "6 6 6 7 10 13 16 22 23 6+ 9+ 10+ 11+ 17+ 19+ 20+ 25+ 32+ 32+ 34+ 35+")
PLACEBO = re.findall(r"\d+", "1 1 2 2 3 4 4 5 5 8 8 8 8 11 11 12 12 15 17 22 23")

PLAN = b"""
format = 1
[trial]
name = "6-MP"
title = "6-MP against placebo in acute leukaemia"
[arms]
control = "Placebo"
experimental = "6-MP"
allocation = [1, 1]
[endpoint]
parameter = "RELAPSE"
label = "Relapse"
event_is = "bad"
[design]
alpha = 0.025
sides = 1
power = 0.9
hazard_ratio = 0.4
planned_events = 60
looks = [0.5, 1.0]
[efficacy]
spending = "O'Brien-Fleming-type"
"""


def extract() -> bytes:
    text = io.StringIO()
    rows = csv.writer(text, lineterminator="\n")
    rows.writerow(["USUBJID", "TRTP", "PARAMCD", "PARAM", "AVAL", "CNSR"])
    for arm, times in (("6-MP", SIX_MP), ("Placebo", PLACEBO)):
        for number, time in enumerate(times, 1):
            censored = int(time.endswith("+"))
            rows.writerow(
                [f"{arm}-{number}", arm, "RELAPSE", "Time to relapse (weeks)", time.rstrip("+"), censored]
            )
    return text.getvalue().encode()


def evaluated(*changes: tuple[bytes, bytes]) -> dict[str, Any]:
    plan = PLAN
    for old, new in changes:
        assert old in plan
        plan = plan.replace(old, new)
    look = LookGiven((UploadedFile("adtte.csv", extract()),), None, None)
    record = evaluate(settings(CUTOFFS[0]), plan_name="plan.toml", plan=plan, looks=[look])
    assert list(differences(record, EVALUATION_RECORD)) == []
    return record


def printed(text: str) -> Any:
    """Right to half a unit of the last printed digit."""
    return pytest.approx(float(text), abs=0.5 * 10.0 ** -len(text.partition(".")[2]) + 1e-12)


SWAPPED = (
    (b'control = "Placebo"', b'control = "6-MP"'),
    (b'experimental = "6-MP"', b'experimental = "Placebo"'),
)
GOOD = ((b'event_is = "bad"', b'event_is = "good"'), (b"hazard_ratio = 0.4", b"hazard_ratio = 2.5"))


# --- Freireich's trial, the whole path ------------------------------------------------------------------


@pytest.fixture(scope="module")
def six_mp() -> dict[str, Any]:
    look: dict[str, Any] = evaluated()["looks"][0]
    return look


@pytest.mark.parametrize(
    ("changes", "z"),
    [((), "4.09792"), (SWAPPED, "-4.09792"), (GOOD, "-4.09792"), ((*SWAPPED, *GOOD), "4.09792")],
    ids=["6-MP experimental", "arms swapped", "event good", "swapped and good"],
)
def test_z_is_positive_when_the_result_favours_experimental(changes: Any, z: str) -> None:
    assert evaluated(*changes)["looks"][0]["logrank"]["z"] == printed(z)


def test_log_rank(six_mp: dict[str, Any]) -> None:
    """Printed: O 21 and 9, E 10.7 and 19.3, chi-square 16.8, p 4.17e-05; further digits computed."""
    test = six_mp["logrank"]
    assert test["observed"] == 9
    assert test["expected"] == printed("19.250501")
    assert test["variance"] == printed("6.256961")
    assert test["chi_square"] == printed("16.79294")
    assert test["p_two_sided"] == pytest.approx(4.17e-5, abs=0.005e-5)
    swapped = evaluated(*SWAPPED)["looks"][0]["logrank"]
    assert swapped["observed"] == 21
    assert swapped["expected"] == printed("10.749499")


def test_hazard_ratio_by_efron_s_ties(six_mp: dict[str, Any]) -> None:
    """Computed by R's survival: beta -1.572125 (0.412397), ratio 0.2076 (0.0925 to 0.4659)."""
    cox = six_mp["cox"]
    assert cox["log_hazard_ratio"] == printed("-1.572125")
    assert cox["std_error"] == printed("0.412397")
    assert cox["hazard_ratio"] == printed("0.2076")
    assert (cox["ci_low"], cox["ci_high"]) == (printed("0.0925"), printed("0.4659"))
    assert (cox["level"], cox["ties"]) == (0.95, "Efron")


def test_kaplan_meier_of_6_mp(six_mp: dict[str, Any]) -> None:
    """Time, at risk, events, survival, Greenwood's error; values from memory, computed again.

    The last error is 0.134591 in exact fractions, where 0.134592 is quoted.
    """
    curve = six_mp["curves"][0]
    rows = [
        (6, 21, 3, "0.857143", "0.076360"),
        (7, 17, 1, "0.806723", "0.086935"),
        (10, 15, 1, "0.752941", "0.096350"),
        (13, 12, 1, "0.690196", "0.106815"),
        (16, 11, 1, "0.627451", "0.114054"),
        (22, 7, 1, "0.537815", "0.128234"),
        (23, 6, 1, "0.448179", "0.134591"),
    ]
    at_events = [
        (time, at_risk, events, survival, error)
        for time, at_risk, events, survival, error in zip(
            curve["time"],
            curve["at_risk"],
            curve["events"],
            curve["survival"],
            curve["std_error"],
            strict=True,
        )
        if events
    ]
    assert at_events == [(t, n, d, printed(s), printed(e)) for t, n, d, s, e in rows]
    assert (curve["arm"], curve["interval"]) == ("6-MP", "log-log")


def test_kaplan_meier_of_placebo(six_mp: dict[str, Any]) -> None:
    curve = six_mp["curves"][1]
    survival = re.findall(
        r"\S+", "0.9048 0.8095 0.7619 0.6667 0.5714 0.3810 0.2857 0.1905 0.1429 0.0952 0.0476 0.0000"
    )
    assert curve["time"] == [1, 2, 3, 4, 5, 8, 11, 12, 15, 17, 22, 23]
    assert curve["survival"] == [printed(value) for value in survival]
    no_error = {"not_estimable": "no standard error or interval exists where the estimate is 0 or 1"}
    assert curve["std_error"][-1] == curve["ci_low"][-1] == curve["ci_high"][-1] == no_error


def test_interval_at_week_10_and_medians(six_mp: dict[str, Any]) -> None:
    """By R's survival with log-log limits: 0.5032 to 0.8894; medians 23 (13, not reached) and 8 (4, 11)."""
    first, second = six_mp["curves"]
    at = first["time"].index(10)
    assert (first["ci_low"][at], first["ci_high"][at]) == (printed("0.5032"), printed("0.8894"))
    limits = ("median", "median_ci_low", "median_ci_high")
    assert [first[name] for name in limits] == [23, 13, {"not_estimable": "not reached"}]
    assert [second[name] for name in limits] == [8, 4, 11]
    assert first["follow_up_median"] == 25


def test_the_time_unit_is_that_of_the_extract_and_denominators_stand_beside(six_mp: dict[str, Any]) -> None:
    information = six_mp["information"]
    assert six_mp["time_unit"] == "weeks"
    assert (information["subjects"], information["events"], information["fraction"]) == (42, 30, 0.5)
    assert [(arm["arm"], arm["subjects"], arm["events"]) for arm in information["arms"]] == [
        ("6-MP", 21, 9),
        ("Placebo", 21, 21),
    ]
    assert [arm["person_time"] for arm in information["arms"]] == [359, 182]  # sums of the weeks above
    assert information["score_variance"] == printed("6.256961")
    assert information["variance_ratio"] == pytest.approx(6.256961 / (30 * 0.25), rel=1e-6)


def test_the_boundary_at_half_the_information_is_crossed(six_mp: dict[str, Any]) -> None:
    """Lan and DeMets (1983): 2.9626 at half the information, one-sided 0.025."""
    bound = six_mp["boundary"]
    assert bound["efficacy_z"] == printed("2.9626")
    assert (bound["crossed"], bound["first_crossed"]) == ("efficacy", 1)
    assert bound["efficacy_hazard_ratio"] == pytest.approx(
        2.71828182846 ** (-2.9626 / 6.256961**0.5), rel=1e-4
    )


# --- several looks --------------------------------------------------------------------------------------


def given(look: int) -> LookGiven:
    cutoff = CUTOFFS[look - 1]
    file = UploadedFile(f"adtte-{cutoff}.csv", patients().at(cutoff).csv())
    return LookGiven((file,), cutoff, None)


def test_looks_evaluated_one_after_the_other_are_those_of_the_trial_file(tmp_path: Path) -> None:
    """Received, frozen and read back from the frozen records: every number is the same to the last bit."""
    changes = (("masked = true", "masked = false"),)
    record = evaluate(
        settings(CUTOFFS[3]),
        plan_name="plan.toml",
        plan=plan_text(*changes),
        looks=[given(look) for look in (1, 2, 3, 4)],
    )
    with desk(held(tmp_path, 4, changes=changes)) as open_desk:
        through_file = [record_of(open_desk, look)["looks"][0] for look in (1, 2, 3, 4)]
    powers = [look["outlook"].get("conditional_power") for look in record["looks"]]
    assert [power.pop("chosen") for power in powers if power] == [None, None]  # nobody asked
    assert record["looks"] == through_file
    assert [look["boundary"]["first_crossed"] for look in through_file] == [None, None, 3, 3]


def test_the_full_record_of_an_over_running_look_keeps_its_bound(tmp_path: Path) -> None:
    """For the other reading: the look after a crossing is frozen with the bound it would have had."""
    kinds = ("planned",) * 4
    with desk(held(tmp_path, 4, frozen=4, kinds=kinds)) as open_desk:
        full = [frozen_record(open_desk.trial, look)["looks"][0]["boundary"] for look in (3, 4)]
    assert [each["first_crossed"] for each in full] == [3, 3]
    assert full[1]["crossed"] == "none"
    assert full[1]["efficacy_z"]["not_estimable"].startswith("all alpha is already spent")


def test_findings_of_all_looks_are_in_the_record_and_a_blocking_one_ends_it() -> None:
    broken = LookGiven((UploadedFile("adtte.csv", b"USUBJID,TRTP\n"),), None, None)
    with pytest.raises(SnapshotBlocked) as refused:
        evaluate(settings(CUTOFFS[3]), plan_name="p", plan=plan_text(), looks=[given(1), broken])
    assert refused.value.exit_code == 2
    assert isinstance(refused.value, AppError)
    assert "column 'PARAMCD' missing" in str(refused.value).lower().replace("paramcd", "PARAMCD")


# --- the boundary alone ---------------------------------------------------------------------------------


def bounds(plan: bytes, fractions: list[float] | None = None, final: bool = False) -> list[float]:
    record = boundary(settings(CUTOFFS[0]), plan_name="p", plan=plan, fractions=fractions, final=final)
    assert list(differences(record, BOUNDARY_RECORD)) == []
    return [look["efficacy_z"] for look in record["looks"]]


def test_bounds_of_five_equal_looks() -> None:
    """Lan and DeMets (1983), O'Brien-Fleming-type, one-sided 0.025."""
    five = plan_text(("looks = [0.25, 0.5, 0.75, 1.0]", "looks = [0.2, 0.4, 0.6, 0.8, 1.0]"))
    assert bounds(five) == [printed(z) for z in ("4.8769", "3.3570", "2.6803", "2.2898", "2.0310")]


def test_bounds_at_chosen_fractions_are_final_only_when_that_is_said() -> None:
    """Computed by recursive integration: 3.9286, 2.6700; with 0.7 final 3.6128, 1.9603."""
    assert bounds(plan_text(), [0.3, 0.6]) == [printed("3.9286"), printed("2.6700")]
    assert bounds(plan_text(), [0.35, 0.7], final=True) == [printed("3.6128"), printed("1.9603")]


def test_events_at_a_fraction_are_the_smallest_whole_number_that_reaches_it() -> None:
    """0.07 of 100 is 7, though 0.07 * 100 is a little more in binary."""
    plan = plan_text(("planned_events = 80", "planned_events = 100"))
    record = boundary(settings(CUTOFFS[0]), plan_name="p", plan=plan, fractions=[0.07, 0.333], final=False)
    assert [look["events"] for look in record["looks"]] == [7, 34]
