"""The invented trial: made again byte for byte, with the findings and verdicts that the demo shows."""

from __future__ import annotations

import csv
import io
import math
import tomllib
from collections import Counter
from functools import cache

import pytest

from app.assets import asset
from app.intake.extract import read_extract, received_file
from app.intake.plan import read_plan
from app.intake.samples import changes, read_pooled
from app.model.boundary import LookAsUsed
from app.model.extract import Extract
from app.sequential.boundary import LookAhead, efficacy_rule, next_bound
from app.sequential.design import planned_boundary
from app.settings import Limits
from app.survival.comparison import logrank
from app.survival.cox import cox_two_arms
from demo_data import generate

LISTED = tomllib.loads(asset("demo_data", "extracts.toml").read_text(encoding="utf-8"))["extract"]
PLAN = read_plan(asset("demo_data", "plan.toml").read_bytes(), name="plan.toml", limits=Limits())


@cache
def extract(number: int) -> Extract:
    entry = LISTED[number - 1]
    file = received_file(entry["file"], asset("demo_data", entry["file"]).read_bytes())
    return read_extract([file], PLAN, cutoff=entry["cutoff"], limits=Limits())


def test_the_generator_makes_the_committed_files_again():
    for name, content in generate.extracts().items():
        assert content == asset("demo_data", name).read_bytes(), name


def test_four_extracts_are_there_three_received_and_two_frozen():
    assert [entry["file"] for entry in LISTED] == [f"extract-{number}.csv" for number in (1, 2, 3, 4)]
    assert [entry.get("frozen") for entry in LISTED] == [True, True, False, None]
    assert [entry["kind"] for entry in LISTED] == ["planned", "planned", "planned", "final"]


def test_the_dates_of_the_extracts_follow_each_other():
    moments = [entry[key] for entry in LISTED for key in ("cutoff", "extracted")]
    assert moments == sorted(moments)
    for entry in LISTED[:3]:
        assert entry["extracted"] < entry["received_at"].date()


@pytest.mark.parametrize(
    ("number", "doubts"),
    [
        (1, {}),
        (2, {"time-disagrees-with-dates": "Found 1 row: 677 (441 against 414)"}),
        (3, {"study-differs": "Found 1 row: 1683 ('Q71')"}),
        (
            4,
            {
                "time-zero": "Found 1 row: 1277 ('0')",
                "time-disagrees-with-dates": "Found 1 row: 1005 (865 against 856)",
                "study-differs": "Found 1 row: 1683 ('Q71')",
            },
        ),
    ],
)
def test_each_extract_gives_the_doubts_it_was_made_to_give(number, doubts):
    found = extract(number).findings
    assert {finding.id: finding.severity for finding in found} == dict.fromkeys(doubts, "doubt")
    for finding in found:
        assert doubts[finding.id] in str(finding)


def test_the_doubts_of_the_received_extracts_are_answered_and_no_others():
    for number in (1, 2, 3):
        answered = {each["id"] for each in LISTED[number - 1].get("acknowledgement", ())}
        assert answered == {finding.id for finding in extract(number).doubts}
        assert all(each["reason"].strip() for each in LISTED[number - 1].get("acknowledgement", ()))


def test_there_are_900_patients_in_balanced_blocks():
    sample = extract(4).sample
    assert len(sample.subject) == 900
    for stratum in range(len(sample.stratum_labels)):
        inside = sample.experimental[sample.stratum == stratum]
        assert abs(2 * int(inside.sum()) - inside.size) <= 2  # an open block of four is at most two apart


def test_entry_is_staggered_and_some_patients_drop_out():
    sample = extract(4).sample
    assert sample.start_day.max() - sample.start_day.min() > 700
    rows = csv.DictReader(io.StringIO(asset("demo_data", "extract-4.csv").read_text(encoding="utf-8")))
    reasons = Counter(row["EVNTDESC"] for row in rows if row["PARAMCD"] == "DEATHHF")
    assert reasons["Withdrew consent"] > 10
    assert reasons["Lost to follow-up"] > 10


def test_events_grow_to_the_fractions_of_the_plan():
    fractions = [extract(number).sample.event.sum() / PLAN.design.planned_events for number in (1, 2, 3, 4)]
    assert fractions == pytest.approx([0.26, 0.51, 0.71, 1.0], abs=0.005)


def test_every_extract_holds_both_endpoints():
    for number in (1, 2, 3, 4):
        parameters = extract(number).parameters
        assert [code for code, _, _ in parameters] == ["DEATH", "DEATHHF"]
        assert parameters[0][1] == parameters[1][1]
        assert parameters[0][2] < parameters[1][2]


def test_adjudication_reverses_and_moves_events_between_looks():
    third = changes(extract(2).sample, extract(3).sample)
    fourth = changes(extract(3).sample, extract(4).sample)
    assert (third.reversed_events, third.moved_events) == (("Q17-0144",), ("Q17-0470",))
    assert (fourth.reversed_events, fourth.moved_events) == (("Q17-0441",), ("Q17-0176",))
    for each in (changes(extract(1).sample, extract(2).sample), third, fourth):
        assert each.vanished_subjects == each.changed_arm == each.changed_stratum == ()


def test_some_events_were_reported_after_the_cutoff_they_fell_before():
    for number in (2, 3, 4):
        before, now = extract(number - 1).sample, extract(number).sample
        new = set(changes(before, now).new_events)
        cutoff = int(before.end_day.max())
        late = [
            subject
            for subject, end in zip(now.subject, now.end_day, strict=True)
            if subject in new and end <= cutoff
        ]
        assert late


def test_the_planned_events_reach_the_power_with_a_little_to_spare():
    needed = planned_boundary(
        PLAN.design, PLAN.efficacy, direction=1, experimental_share=PLAN.arms.experimental_share
    ).noncentrality
    events = (needed / math.log(PLAN.design.hazard_ratio)) ** 2 * 4  # d p q = noncentrality^2 / log(ratio)^2
    assert math.ceil(events) == 518
    assert PLAN.design.planned_events == 538


def test_the_third_look_does_not_cross_and_the_fourth_does():
    rule = efficacy_rule(PLAN.design, PLAN.efficacy, PLAN.endpoint.direction)
    past: list[LookAsUsed] = []
    crossed = []
    for number in (1, 2, 3, 4):
        sample = extract(number).sample
        test = logrank(sample.time, sample.event, sample.experimental, stratum=sample.stratum)
        events = int(sample.event.sum())
        fraction = events / PLAN.design.planned_events
        look = LookAhead(number, LISTED[number - 1]["kind"], float(events), fraction, events, test.variance)
        bound = next_bound(rule, past, look)
        crossed.append(test.z >= bound.efficacy_z)
        past.append(
            LookAsUsed(
                number,
                look.kind,
                float(events),
                events,
                fraction,
                test.z,
                bound.efficacy_z,
                bound.alpha_spent,
                bound.final,
            )
        )
    assert crossed == [False, False, False, True]
    assert past[-1].final


def test_the_estimate_at_the_end_is_near_the_ratio_that_was_put_in():
    sample = extract(4).sample
    fit = cox_two_arms(sample.time, sample.event, sample.experimental, stratum=sample.stratum)
    assert fit.ci_low < generate.HAZARD_RATIO < fit.ci_high
    assert fit.hazard_ratio == pytest.approx(generate.HAZARD_RATIO, abs=0.08)


def test_the_open_side_counts_the_same_events():
    for number in (1, 2, 3, 4):
        name = LISTED[number - 1]["file"]
        file = received_file(name, asset("demo_data", name).read_bytes())
        pooled = read_pooled([file], PLAN, limits=Limits())
        assert pooled.event.sum() == extract(number).sample.event.sum()
