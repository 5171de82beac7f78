"""The endpoints of harm and of further hypotheses: read, checked as the plan's own, and held against it."""

from __future__ import annotations

import pytest

from app.intake.plan import PlanRefused, read_plan
from app.model.plan import Plan
from app.settings import Limits
from tests.unit.intake.trial import PLAN, Row, file_of, ids, read, rows

HYPOTHESIS = """
[[hypothesis]]
name = "Stroke"
parameter = "STROKE"
label = "Stroke"
event_is = "bad"
after = "primary"
alpha = 0.025
planned_events = 90
efficacy = {spending = "Pocock-type"}
"""
HARM = """
[harm]
spending = "Pocock-type"
alpha = 0.025
parameter = "BLEED"
"""


def plan(*tables: str) -> Plan:
    text = PLAN.replace("COLUMNS", 'strata = ["REGION"]') + "".join(tables)
    return read_plan(text.encode(), name="plan.toml", limits=Limits())


def of(parameter: str, listed: list[Row] | None = None, **changed: str) -> list[Row]:
    return [
        {**row, "PARAMCD": parameter, "EVNTDESC": "", **changed}
        for row in (rows() if listed is None else listed)
    ]


def test_the_further_endpoints_of_a_plan_each_once() -> None:
    codes = [each.parameter for each in plan(HARM, HYPOTHESIS).further_endpoints]
    assert codes == ["STROKE", "BLEED"]
    same = HARM.replace("BLEED", "STROKE")
    assert [each.parameter for each in plan(same, HYPOTHESIS).further_endpoints] == ["STROKE"]
    assert plan(HARM.replace("BLEED", "DEATH")).further_endpoints == ()


def test_each_further_endpoint_becomes_a_sample_of_its_own() -> None:
    extract = read(file_of(rows() + of("STROKE", CNSR="1") + of("BLEED")), under=plan(HARM, HYPOTHESIS))
    assert ids(extract) == ["no-events"]
    assert extract.sample is not None
    assert [(each.parameter, int(each.event.sum())) for each in extract.further] == [
        ("STROKE", 0),
        ("BLEED", 6),
    ]
    assert extract.further[1].subject == extract.sample.subject


def test_an_endpoint_that_the_extract_lacks_blocks_by_name() -> None:
    extract = read(file_of(rows() + of("BLEED")), under=plan(HARM, HYPOTHESIS))
    assert ids(extract) == ["parameter-absent"]
    assert "'STROKE'" in extract.findings[0].what
    assert extract.sample is None
    assert extract.further == ()


def test_what_is_wrong_in_a_further_endpoint_says_whose_rows_they_are() -> None:
    extract = read(file_of(rows() + of("BLEED", AVAL="-3")), under=plan(HARM))
    (finding,) = [each for each in extract.findings if each.id == "time-negative"]
    assert finding.where == "adtte.csv, column AVAL, rows of 'BLEED'"
    assert extract.sample is None


def test_a_note_on_the_files_is_told_once() -> None:
    listed = [{name: text for name, text in row.items() if name != "ADT"} for row in rows() + of("BLEED")]
    extract = read(file_of(listed), under=plan(HARM))
    assert ids(extract).count("cutoff-not-checked") == 1


def test_a_subject_in_two_arms_blocks_and_the_rows_are_named() -> None:
    other = of("BLEED")
    other[3]["TRTP"] = "PLACEBO"
    extract = read(file_of(rows() + other), under=plan(HARM))
    (finding,) = [each for each in extract.findings if each.id == "arm-differs"]
    assert finding.severity == "block"
    assert finding.rows == (16,)
    assert "'PLACEBO'" in finding.found


def test_a_subject_in_two_strata_and_subjects_without_a_row_are_doubts() -> None:
    other = of("BLEED")[:10]
    other[2]["REGION"] = "South"
    stranger = {**other[0], "USUBJID": "T1-099"}
    extract = read(file_of([*rows(), *other, stranger]), under=plan(HARM))
    doubts = {each.id: each for each in extract.doubts}
    assert doubts["stratum-differs"].rows == (15,)
    found = doubts["subjects-differ"].found
    assert found == "2 subjects of 'DEATH' without a row of 'BLEED', 1 the other way round"
    assert extract.sample is not None


@pytest.mark.parametrize(
    ("tables", "start"),
    [
        ((HYPOTHESIS.replace('"STROKE"', '"DEATH"'),), "Two hypotheses stand on one endpoint"),
        (
            (HYPOTHESIS, HYPOTHESIS.replace('name = "Stroke"', 'name = "Again"')),
            "Two hypotheses stand on one endpoint",
        ),
        (
            (HARM.replace("BLEED", "STROKE"), HYPOTHESIS.replace('"bad"', '"good"')),
            "Harm would be judged on an endpoint whose event is good",
        ),
        (
            (
                HYPOTHESIS.replace('"primary"', '"Bleed"'),
                HYPOTHESIS.replace("Stroke", "Bleed")
                .replace("STROKE", "BLEED")
                .replace('"primary"', '"Stroke"'),
            ),
            "Hypotheses wait for each other in a circle",
        ),
    ],
)
def test_endpoints_and_chains_that_cannot_be_are_told(tables: tuple[str, ...], start: str) -> None:
    with pytest.raises(PlanRefused) as refused:
        plan(*tables)
    assert str(refused.value).startswith(start)
    assert len(refused.value.problems) == 1
