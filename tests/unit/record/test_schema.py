"""The check that a record keeps to its names: what it lets pass, and every way in which it says no."""

from __future__ import annotations

from typing import Any

import pytest

from app.record.schema import (
    ESTIMATE,
    EVALUATION_RECORD,
    LOOK,
    LOOKS_RECORD,
    NUMBER,
    Estimable,
    Maybe,
    differences,
)

SHAPE = {"z": NUMBER, "median": ESTIMATE, "note": Maybe(str), "test": Estimable({"p": NUMBER}), "rows": [int]}
SOUND = {"z": 2.1, "median": 8, "note": None, "test": {"p": 0.02}, "rows": [1, 2]}


def found(**changed: Any) -> list[str]:
    return list(differences({**SOUND, **changed}, SHAPE, "r"))


def test_a_record_of_the_shape_has_no_differences() -> None:
    assert found() == []


def test_what_cannot_be_estimated_is_a_reason_where_the_shape_allows_one() -> None:
    reason = {"not_estimable": "no event was observed"}
    assert found(median=reason, test=reason) == []
    assert found(z=reason) == [
        "r.z: {'not_estimable': 'no event was observed'} is not of the kind recorded there"
    ]


@pytest.mark.parametrize("reason", ["", None, 3])
def test_a_reason_is_words(reason: Any) -> None:
    assert found(median={"not_estimable": reason}) == ["r.median: not_estimable without a reason"]


@pytest.mark.parametrize(
    ("changed", "said"),
    [
        ({"z": None}, "r.z: None is not of the kind recorded there"),
        ({"z": float("nan")}, "r.z: nan is not of the kind recorded there"),
        ({"z": float("inf")}, "r.z: inf is not of the kind recorded there"),
        ({"z": True}, "r.z: True is not of the kind recorded there"),
        ({"z": "2.1"}, "r.z: '2.1' is not of the kind recorded there"),
        ({"note": 1}, "r.note: 1 is not of the kind recorded there"),
        ({"rows": [1, 2.0]}, "r.rows[1]: 2.0 is not of the kind recorded there"),
        ({"rows": 3}, "r.rows: int where a list belongs"),
        ({"test": [0.02]}, "r.test: list where an object belongs"),
        ({"test": {"p": 0.02, "q": 1}}, "r.test.q: not a name of the record"),
        ({"test": {}}, "r.test.p: missing"),
    ],
)
def test_each_difference_says_where_and_what(changed: dict[str, Any], said: str) -> None:
    assert found(**changed) == [said]


def test_the_parts_that_no_plan_can_ask_for_yet_are_null() -> None:
    assert list(differences(None, LOOK["hypotheses"])) == []
    assert list(differences({"name": "Death"}, LOOK["hypotheses"])) != []


def test_the_outlook_has_three_conditional_powers_under_each_effect() -> None:
    """The names of the design; the trend's limits, the ratios and the next look stand beside them."""
    outlook = LOOK["outlook"].shape.shape
    assert {"conditional_power", "criterion", "predictive_power"} <= outlook.keys()
    assert {"design", "trend", "null"} <= outlook["conditional_power"].keys()
    assert {"final_look", "path", "path_futility_obeyed"} <= outlook["conditional_power"]["design"].keys()
    assert outlook["predictive_power"].keys() == {"flat", "prior"}
    assert LOOK["repeated_interval"].shape.shape.keys() == {"ci_low", "ci_high", "level"}
    stopping = "p_one_sided median_unbiased_hazard_ratio ci_low ci_high level"
    assert set(stopping.split()) == LOOK["stopping"].shape.shape.keys()


def test_only_what_evaluate_prints_has_a_place_for_a_chosen_ratio() -> None:
    """A trial file's record has no name for it; null says that `evaluate` was not asked."""
    kept = LOOK["outlook"].shape.shape["conditional_power"]
    printed = EVALUATION_RECORD["looks"][0]["outlook"].shape.shape["conditional_power"]
    assert printed.keys() - kept.keys() == {"chosen"}
    power = {"hazard_ratio": 0.8, "final_look": 0.5, "path": 0.5, "path_futility_obeyed": None}
    powers = dict.fromkeys(kept, power)
    assert list(differences(powers, kept, "powers")) == []
    for chosen in (None, power):
        asked = {**powers, "chosen": chosen}
        assert list(differences(asked, printed)) == []
        assert list(differences(asked, kept, "powers")) == ["powers.chosen: not a name of the record"]
    assert list(differences(powers, printed, "powers")) == ["powers.chosen: missing"]


def test_the_names_of_a_look_are_those_of_the_design() -> None:
    """The names of the record that other programs rely on, written out here once more."""
    names = """kind time_unit cutoff information logrank logrank_unstratified cox cox_unstratified curves
        boundary proportionality restricted_mean weighted weighted_maximum landmarks outlook
        repeated_interval stopping hypotheses"""
    assert set(names.split()) <= LOOK.keys()
    envelope = "format kind program plan_digest snapshot_digests orientation run_at findings held looks"
    assert set(envelope.split()) == LOOKS_RECORD.keys()
    information = "subjects events fraction score_variance variance_ratio arms strata"
    assert set(information.split()) <= LOOK["information"].keys()
    test = "observed expected variance z chi_square p_one_sided p_two_sided strata"
    assert set(test.split()) == LOOK["logrank"].shape.keys()
    ratio = "log_hazard_ratio std_error hazard_ratio ci_low ci_high level ties"
    assert set(ratio.split()) == LOOK["cox"].shape.keys()
    curve = """arm time at_risk events censored survival std_error ci_low ci_high median median_ci_low
        median_ci_high follow_up_median"""
    assert set(curve.split()) <= LOOK["curves"][0].keys()
    bound = """number information_fraction events alpha_spent alpha_spent_here efficacy_z efficacy_p_one_sided
        efficacy_hazard_ratio futility_z type_two_spent harm_z harm_alpha_spent crossed first_crossed"""
    assert set(bound.split()) <= LOOK["boundary"].keys()
