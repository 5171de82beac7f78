"""Further hypotheses and harm on its own endpoint in a trial file: frozen, verified, amended."""

from __future__ import annotations

from pathlib import Path

import pytest

from app.actions.amend import amend
from app.actions.check import verify_desk
from app.actions.freeze import freeze
from app.actions.looks import closed_book, record_of
from app.actions.receive import receive
from app.errors import InputError
from tests.unit.actions.invented_file import BY, desk, held, incoming, started
from tests.unit.review.invented_trial import (
    CUTOFFS,
    DEATH_AFTER_RELAPSE,
    HARM_ON_DEATH,
    patients,
    plan_text,
    two_endpoints,
)
from tests.unit.sheets.invented_looks import FURTHER, table_texts, text


def amended(*changes: tuple[str, str]) -> bytes:
    return plan_text(*changes, of=plan_text(FURTHER).decode())


def test_each_look_verifies_number_by_number(tmp_path: Path) -> None:
    with desk(held(tmp_path, 4, frozen=4, changes=(FURTHER,))) as open_desk:
        report = verify_desk(open_desk)
        assert report.ok, [line.text for line in report.lines if not line.ok]
        assert sum("every number agrees" in line.text for line in report.lines) == 8


def test_what_an_amendment_changes_leaves_the_bounds_of_a_hypothesis_as_used(tmp_path: Path) -> None:
    plan = amended(
        ("planned_events = 60", "planned_events = 90"),
        ('planned_events = 90\nefficacy = {spending = "Pocock-type"}',
         'planned_events = 90\nefficacy = {spending = "O\'Brien-Fleming-type"}'),
    )  # fmt: skip
    with desk(held(tmp_path, 2, frozen=2, changes=(FURTHER,)), 3) as open_desk:
        before = [record_of(open_desk, look)["looks"][0]["hypotheses"][0]["boundary"] for look in (1, 2)]
        amend(open_desk, plan_name="plan-2.toml", plan=plan, reason="Fewer deaths than foreseen", by=BY)
        after = [record_of(open_desk, look)["looks"][0]["hypotheses"][0]["boundary"] for look in (1, 2)]
        assert before == after
        receive(
            open_desk,
            incoming(CUTOFFS[2], content=two_endpoints(patients(), CUTOFFS[2])),
            acknowledgements={},
            by=BY,
        )
        third = record_of(open_desk, 3)["looks"][0]["hypotheses"][0]
        assert third["information"]["planned_events"] == 90
        assert [look["efficacy_z"] for look in third["history"]] == [each["efficacy_z"] for each in before]
        assert third["boundary"]["alpha_spent"] >= before[1]["alpha_spent"]  # nothing is unspent


def test_a_hypothesis_dropped_and_taken_up_again_does_not_spend_twice(tmp_path: Path) -> None:
    without = plan_text((FURTHER[0], FURTHER[1].split("[[hypothesis]]")[0] + "[enrolment]"))
    with desk(held(tmp_path, 1, frozen=1, changes=(FURTHER,)), 4) as open_desk:
        spent = record_of(open_desk, 1)["looks"][0]["hypotheses"][0]["boundary"]["alpha_spent"]
        amend(open_desk, plan_name="p2.toml", plan=without, reason="Dropped", by=BY)
        content = two_endpoints(patients(), CUTOFFS[1])
        receive(open_desk, incoming(CUTOFFS[1], content=content), acknowledgements={}, by=BY)
        assert record_of(open_desk, 2)["looks"][0]["hypotheses"] is None
        freeze(open_desk, by=BY)
        amend(open_desk, plan_name="p3.toml", plan=plan_text(FURTHER), reason="Taken up again", by=BY)
        content = two_endpoints(patients(), CUTOFFS[2])
        receive(open_desk, incoming(CUTOFFS[2], content=content), acknowledgements={}, by=BY)
        third = record_of(open_desk, 3)["looks"][0]["hypotheses"][0]
        assert [each["number"] for each in third["history"]] == [1]
        here = third["boundary"]["alpha_spent"] - third["boundary"]["alpha_spent_here"]
        assert here == pytest.approx(spent, rel=1e-12)


@pytest.mark.parametrize(
    ("before", "after"),
    [
        ('[harm]\nspending = "Pocock-type"\nalpha = 0.025\n', HARM_ON_DEATH),
        (HARM_ON_DEATH, HARM_ON_DEATH.replace('parameter = "DEATH"', "")),
        (DEATH_AFTER_RELAPSE, DEATH_AFTER_RELAPSE.replace('"bad"', '"good"')),
    ],
)
def test_what_was_dropped_does_not_come_back_on_another_endpoint_or_turned_round(
    tmp_path: Path, before: str, after: str
) -> None:
    """Its bounds would rest on looks held by other counts, or with a z that points the other way."""

    def tables(written: str) -> tuple[str, str]:
        return "[enrolment]", f"{written}[enrolment]"

    content = two_endpoints(patients(), CUTOFFS[0])
    with desk(started(tmp_path, (tables(before),)), 2) as open_desk:
        receive(open_desk, incoming(CUTOFFS[0], content=content), acknowledgements={}, by=BY)
        freeze(open_desk, by=BY)
        amend(open_desk, plan_name="p2.toml", plan=plan_text(), reason="Dropped", by=BY)
        entries = open_desk.trial.entries()
        with pytest.raises(InputError, match=r"cannot be amended in p3\.toml"):
            amend(open_desk, plan_name="p3.toml", plan=plan_text(tables(after)), reason="Again", by=BY)
        assert open_desk.trial.entries() == entries


def test_an_extract_without_the_further_endpoint_is_refused_whole(tmp_path: Path) -> None:
    path = held(tmp_path, 1, frozen=1, changes=(FURTHER,))
    before = path.read_bytes()
    with desk(path, 2) as open_desk, pytest.raises(InputError, match="No row of endpoint 'DEATH'"):
        receive(open_desk, incoming(CUTOFFS[1]), acknowledgements={}, by=BY)
    assert path.read_bytes() == before


def test_the_boundary_sheet_says_what_waits_and_the_glance_too(tmp_path: Path) -> None:
    with desk(held(tmp_path, 2, changes=(FURTHER,)), 2) as open_desk:
        book = closed_book(open_desk, 2, session=None)
        boundary = book.sheet("boundary")
        assert boundary is not None
        assert "Death waits for the plan’s endpoint." in text(boundary.notes[0])
        heads = [text(row.head) for row in boundary.figure.rows]  # type: ignore[union-attr]
        assert heads[-5:] == [
            "Efficacy bound, ±",
            "Harm bound on Death, each reading",
            "z of Death",
            "bound of Death, ±",
            "Alpha spent, one-sided",
        ]
        assert [text(table.caption) for table in boundary.folded][:2] == [
            "Death, arm A against arm B",
            "Harm, judged on Death, arm A against arm B",
        ]
        assert [table.caption[0].text for table in boundary.folded][:2] == ["Death", "Harm, judged on Death"]
        harm = table_texts(boundary, "Harm, judged on Death")
        assert "Harm bound, each reading" in harm
        lanes = boundary.figure.lanes  # type: ignore[union-attr]
        assert all(lane.harm is None for lane in lanes)  # another z than that of the lanes
