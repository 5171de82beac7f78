"""Exchanged censoring values are noticed by what the descriptions, the dates or the times say."""

from __future__ import annotations

from dataclasses import replace

import pytest

from app.model.plan import Endpoint
from tests.unit.intake.trial import Row, file_of, ids, plan, read, rows, without


def exchanged(listed: list[Row]) -> list[Row]:
    return [{**row, "CNSR": {"0": "1", "1": "0"}[row["CNSR"]]} for row in listed]


def described(event: str, censored: str) -> list[Row]:
    return [{**row, "EVNTDESC": event if row["CNSR"] == "0" else censored} for row in rows()]


@pytest.mark.parametrize(
    "censored",
    [
        "Censored",
        "Alive",
        "Lost to follow-up",
        "Event-free at cutoff",
        "Completed study",
        "No event",
        "Ongoing",
    ],
)
def test_descriptions_of_censoring_under_0_block(censored):
    assert ids(read(file_of(exchanged(described("Event", censored))))) == ["censor-inverted"]


def test_a_word_of_the_endpoint_under_1_blocks_where_censoring_is_not_described():
    assert ids(read(file_of(exchanged(described("DEATH", ""))))) == ["censor-inverted"]


@pytest.mark.parametrize(
    ("event", "censored"),
    [
        ("Death", "No death by the cutoff"),
        ("Death of cardiac cause", "Death of another cause"),
        ("", "Alive"),
        ("Death", ""),
        ("Withdrawn", "Completed study"),
    ],
)
def test_sound_descriptions_give_no_finding(event, censored):
    assert ids(read(file_of(described(event, censored)))) == []


def test_alive_may_describe_a_good_event():
    good = replace(plan(), endpoint=Endpoint("DEATH", "Recovery", "good"))
    assert ids(read(file_of(described("Discharged alive", "Ill")), under=good)) == []


def test_a_word_of_the_endpoint_under_1_is_a_doubt_where_events_have_words_of_their_own():
    good = replace(plan(), endpoint=Endpoint("DEATH", "Discharge from hospital", "good"))
    (finding,) = read(file_of(described("Discharged alive", "In hospital")), under=good).findings
    assert (finding.id, finding.severity) == ("censor-suspicious", "doubt")


def test_one_contradiction_is_a_doubt_with_its_row():
    listed = rows()
    listed[4]["EVNTDESC"] = "Censored at last visit"
    (finding,) = read(file_of(listed)).findings
    assert (finding.id, finding.severity, finding.rows) == ("censor-contradicted", "doubt", (5,))


def test_events_that_fall_on_the_cutoff_are_a_doubt():
    listed = without("EVNTDESC", exchanged(rows()))
    assert ids(read(file_of(listed))) == ["censor-suspicious"]


def test_without_a_cutoff_the_last_day_there_is_serves():
    listed = without("EVNTDESC", exchanged(rows()))
    assert ids(read(file_of(listed), cutoff=None)) == ["censor-suspicious"]


def test_without_dates_the_order_of_times_serves_and_no_arm_is_looked_at():
    listed = without("EVNTDESC STARTDT ADT", exchanged(rows(24)))
    (finding,) = read(file_of(listed), cutoff=None).findings
    assert finding.id == "censor-suspicious"
    for row in listed:
        row["TRTP"] = {"TABLET": "PLACEBO", "PLACEBO": "TABLET"}[row["TRTP"]]
    assert read(file_of(listed), cutoff=None).findings == (finding,)


def test_sound_values_without_dates_and_descriptions_give_no_finding():
    assert ids(read(file_of(without("EVNTDESC STARTDT ADT", rows(24))), cutoff=None)) == []
