"""The record of every kind of look keeps to its names, and holds what the look holds."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from datetime import date
from typing import Any

import numpy as np
import pytest

from app.model.extract import LookKind
from app.model.plan import Plan
from app.model.values import Absent, read_only
from app.record.canonical import parse_strict
from app.record.schema import LOOKS_RECORD, differences
from app.record.text import record_bytes
from app.review import LookDeclared, review_look
from app.views.closed import ClosedView, Letters, full_view, masked_view, unmasked_view
from app.views.record import looks_record
from tests.unit.review.invented_trial import CUTOFFS, patients, plan
from tests.unit.sheets.invented_looks import A_IS_CONTROL, A_IS_EXPERIMENTAL, FURTHER, TWO_SIDED, Held, held

WITHOUT_STRATA = (('strata = ["REGION"]', ""),)
GOOD_EVENT = (('event_is = "bad"', 'event_is = "good"'), ("hazard_ratio = 0.5", "hazard_ratio = 2.0"))


def all_views(look: Held) -> list[ClosedView]:
    letters = (Letters("A"), Letters("B"))
    return [look.view(), full_view(look.result, look.plan), *(look.view(each) for each in letters)]


def record(view: ClosedView) -> dict[str, Any]:
    return looks_record("look", [view], run_at="2027-01-01T00:00:00Z")


@pytest.mark.parametrize(
    "changes",
    [(), (TWO_SIDED,), WITHOUT_STRATA, GOOD_EVENT, (FURTHER,)],
    ids=["plain", "two sides", "no strata", "good event", "further endpoints"],
)
@pytest.mark.parametrize("kinds", [(), ("safety", "unplanned", "final")], ids=["planned", "other kinds"])
def test_every_look_in_every_view_keeps_to_the_names(
    changes: Sequence[tuple[str, str]], kinds: Sequence[LookKind]
) -> None:
    for look in held(plan(*changes), kinds=kinds):
        for view in all_views(look):
            assert list(differences(record(view), LOOKS_RECORD)) == []
            assert parse_strict(record_bytes(record(view))) == record(view)


def nothing_estimable(under: Plan) -> ClosedView:
    """Twelve subjects, all censored on one day."""
    sample = patients().at(date(2024, 2, 20)).sample()
    sample = replace(sample, event=read_only(np.zeros(sample.time.size), np.bool_))
    return unmasked_view(review_look(under, sample, LookDeclared(1, "planned"), ()), under, A_IS_CONTROL)


def test_where_nothing_can_be_estimated_the_record_says_so_in_words() -> None:
    view = nothing_estimable(plan())
    look = record(view)["looks"][0]
    assert list(differences(record(view), LOOKS_RECORD)) == []
    for part in ("logrank", "logrank_unstratified", "cox", "cox_unstratified"):
        assert look[part] == {"not_estimable": "no event was observed"}
    assert look["information"]["variance_ratio"] == {"not_estimable": "no event was observed"}
    assert {curve["median"]["not_estimable"] for curve in look["curves"]} == {"not reached"}
    assert look["boundary"]["efficacy_z"]["not_estimable"].startswith("no new information")


def test_a_masked_record_carries_the_one_directional_parts_for_both_readings_only() -> None:
    look = record(held()[2].view(A_IS_CONTROL))["looks"][0]
    assert look["boundary"]["crossed"] is look["boundary"]["first_crossed"] is None
    assert look["logrank"]["p_one_sided"] is None
    assert [reading["experimental"] for reading in look["readings"]] == ["A", "B"]
    assert {each["crossed"] for each in look["history"]} == {None}


@pytest.mark.parametrize("changes", [(), (FURTHER,)], ids=["plain", "further endpoints"])
def test_a_masked_record_is_the_same_whichever_letter_is_experimental(
    changes: Sequence[tuple[str, str]],
) -> None:
    """The same patients under A and under B; only what the plan calls them is exchanged."""
    under = plan(*changes)
    as_they_are, exchanged = held(under), held(under, patients().with_arms_exchanged())
    for one, other in zip(as_they_are, exchanged, strict=True):
        seen = record(one.view(A_IS_CONTROL))["looks"]
        assert record_bytes(seen) == record_bytes(record(other.view(A_IS_EXPERIMENTAL))["looks"])


def test_while_it_waits_a_hypothesis_says_for_what_in_each_reading() -> None:
    waiting, tested = (held(plan(FURTHER))[at] for at in (1, 3))
    (of_record,) = record(waiting.view())["looks"][0]["hypotheses"]
    assert (of_record["name"], of_record["after"], of_record["alpha"]) == ("Death", "primary", 0.025)
    assert of_record["boundary"]["waits_for"] == "primary"
    masked = record(tested.view(A_IS_CONTROL))["looks"][0]["hypotheses"][0]
    assert [reading["waits_for"] for reading in masked["readings"]] == ["primary", None]
    assert [reading["crossed"] for reading in masked["readings"]] == ["none", "efficacy"]
    assert masked["boundary"]["waits_for"] is masked["boundary"]["crossed"] is None


def test_the_level_of_all_hypotheses_is_recorded() -> None:
    assert record(held()[0].view())["looks"][0]["alpha_of_all"] == 0.025
    assert record(held(plan(FURTHER))[0].view())["looks"][0]["alpha_of_all"] == 0.025


def test_an_unmasked_record_has_one_direction_and_no_readings() -> None:
    whole = record(held()[2].view())
    assert whole["orientation"] == {"of": "PELLETOL", "against": "SYRUPINE"}
    look = whole["looks"][0]
    assert look["readings"] is None
    assert look["boundary"]["crossed"] == "efficacy"
    assert look["boundary"]["first_crossed"] == 3
    assert [each["arm"] for each in look["curves"]] == ["PELLETOL", "SYRUPINE"]


def test_two_sided_alphas_are_of_one_side_and_carry_their_sides() -> None:
    """Two-sided 0.05 is two sides of 0.025: the same bound at the same events."""
    one, two = (
        record(held(plan(*changes))[0].view())["looks"][0]["boundary"] for changes in ((), (TWO_SIDED,))
    )
    assert (one.pop("sides"), two.pop("sides")) == (1, 2)
    assert one == two


def test_a_stratum_without_the_plan_s_factors_is_one_of_all_subjects() -> None:
    look = record(held(plan(*WITHOUT_STRATA))[0].view())["looks"][0]
    assert [each["label"] for each in look["information"]["strata"]] == ["All subjects"]
    assert look["logrank"]["z"] == look["logrank_unstratified"]["z"]


def test_the_changes_of_the_record_add_up_to_the_events() -> None:
    looks = held()
    before, now = (record(each.view())["looks"][0] for each in looks[:2])
    changes = now["changes"]
    gained = changes["new_events"] + changes["new_subjects_with_event"]
    lost = changes["reversed_events"] + changes["vanished_with_event"]
    assert before["changes"] is None
    assert now["information"]["events"] == before["information"]["events"] + gained - lost
    assert gained > 0


def test_the_denominators_of_the_record_add_up() -> None:
    for look in held(cutoffs=CUTOFFS[:2]):
        information = record(look.view())["looks"][0]["information"]
        for name in ("subjects", "events"):
            assert sum(arm[name] for arm in information["arms"]) == information[name]
            assert sum(stratum[name] for stratum in information["strata"]) == information[name]
            for stratum in information["strata"]:
                assert sum(arm[name] for arm in stratum["arms"]) == stratum[name]


def test_absent_is_no_number_in_any_record() -> None:
    view = nothing_estimable(plan())
    assert isinstance(view.logrank, Absent)
    assert masked_view(view.look, view.plan, A_IS_CONTROL).readings[1].z == view.logrank
