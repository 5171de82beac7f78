"""What a new version of a plan changes, key by key, and what it cannot change."""

from __future__ import annotations

from dataclasses import replace

import pytest

from app.intake.amendment import FIXED, PlanChange, plan_changes, refuse_fixed, written
from app.intake.plan import PlanRefused, read_plan
from app.intake.plan_keys import TABLES
from app.model.plan import Efficacy, Futility, Harm, HeldLook, Hypothesis, Plan
from app.settings import Limits
from tests.actions.given import PLAN, plan_with, revised_plan


def plan(content: bytes = PLAN) -> Plan:
    return read_plan(content, name="plan.toml", limits=Limits())


def test_each_changed_key_is_told_as_it_was_and_as_it_is() -> None:
    assert plan_changes(plan(), plan(revised_plan())) == (
        PlanChange("design.planned_events", "538", "600"),
        PlanChange("design.looks", "[0.25, 0.5, 0.75, 1.0]", "[0.3, 0.55, 0.8, 1.0]"),
        PlanChange("efficacy.spending", '"O\'Brien-Fleming-type"', '"Pocock-type"'),
    )


def test_a_plan_written_otherwise_with_the_same_meaning_changes_nothing() -> None:
    assert plan_changes(plan(), plan(PLAN + b"\n# a remark\n")) == ()
    assert plan_changes(plan(), plan(plan_with((b"alpha = 0.025", b"alpha = 2.5e-2")))) == ()
    assert plan_changes(plan(), plan(PLAN + b"confidence = 0.95\n")) == ()  # the default


def test_a_key_that_was_left_out_was_not_set() -> None:
    later = replace(plan(), columns=replace(plan().columns, site="SITEID"))
    assert plan_changes(plan(), later) == (PlanChange("columns.site", "not set", '"SITEID"'),)
    assert plan_changes(later, plan()) == (PlanChange("columns.site", '"SITEID"', "not set"),)


def test_whole_tables_come_and_go_key_by_key() -> None:
    later = replace(
        plan(), futility=Futility(spending="power", exponent=2.0), harm=Harm("Pocock-type", 0.05, "DEATH")
    )
    assert plan_changes(plan(), later) == (
        PlanChange("futility.spending", "not set", '"power"'),
        PlanChange("futility.exponent", "not set", "2.0"),
        PlanChange("futility.binding", "not set", "false"),
        PlanChange("harm.spending", "not set", '"Pocock-type"'),
        PlanChange("harm.alpha", "not set", "0.05"),
        PlanChange("harm.parameter", "not set", '"DEATH"'),
    )


DEATH = Hypothesis("Death", "DEATH", "Death", "bad", 0.025, 300, Efficacy("Pocock-type"), after="primary")
STROKE = replace(DEATH, name="Stroke", parameter="STROKE")


def test_hypotheses_are_told_apart_by_their_endpoint() -> None:
    keys = [change.key for change in plan_changes(plan(), replace(plan(), hypotheses=(DEATH,)))]
    assert keys[0] == "hypothesis[DEATH].name"
    assert "hypothesis[DEATH].efficacy.spending" in keys
    both, one = replace(plan(), hypotheses=(DEATH, STROKE)), replace(plan(), hypotheses=(STROKE,))
    assert {change.key.partition(".")[0] for change in plan_changes(both, one)} == {"hypothesis[DEATH]"}


def test_a_hypothesis_comes_or_goes_whole_but_does_not_turn_round() -> None:
    one, turned = (replace(plan(), hypotheses=(replace(DEATH, event_is=way),)) for way in ("bad", "good"))
    refuse_fixed([plan()], one, "plan-2.toml")
    refuse_fixed([one], plan(), "plan-2.toml")
    refuse_fixed([one, plan()], one, "plan-3.toml")
    for earlier in ([one], [one, plan()], [one, plan(), replace(plan(), hypotheses=(STROKE,))]):
        with pytest.raises(PlanRefused, match=r"Hypothesis\[DEATH\].event_is cannot be amended"):
            refuse_fixed(earlier, turned, "plan-2.toml")


def test_harm_comes_or_goes_whole_but_stays_on_its_endpoint() -> None:
    on_death, on_stroke, on_own = (
        replace(plan(), harm=Harm("Pocock-type", 0.05, endpoint)) for endpoint in ("DEATH", "STROKE", None)
    )
    refuse_fixed([plan()], on_death, "plan-2.toml")
    refuse_fixed([on_death], plan(), "plan-2.toml")
    refuse_fixed([on_death, plan()], on_death, "plan-3.toml")
    for before, after in ((on_death, on_own), (on_own, on_death), (on_death, on_stroke)):
        for earlier in ([before], [before, plan()]):
            with pytest.raises(PlanRefused, match=r"Harm\.parameter cannot be amended"):
                refuse_fixed(earlier, after, "plan-2.toml")


def test_harm_may_name_the_endpoint_that_it_stands_on() -> None:
    own = Harm("Pocock-type", 0.05)
    named = replace(own, endpoint_parameter=plan().endpoint.parameter)
    for before, after in ((own, named), (named, own)):
        refuse_fixed([replace(plan(), harm=before)], replace(plan(), harm=after), "plan-2.toml")


def test_every_key_of_a_plan_has_the_name_that_the_plan_file_gives_it() -> None:
    held = HeldLook(1, 100, 1.0, 3.0, 0.001, "Charter")
    whole = replace(plan(), futility=Futility("power"), harm=Harm("Pocock-type", 0.05, "DEATH"), held=(held,))
    bare = replace(plan(), held=())
    for change in (*plan_changes(bare, whole), *plan_changes(plan(), plan(revised_plan()))):
        table, _, key = change.key.replace("[1]", "").partition(".")
        assert key in TABLES[table].known


@pytest.mark.parametrize(
    ("change", "key"),
    [
        ((b'name = "Q17"', b'name = "Q18"'), "trial.name"),
        ((b'control = "PLACEBO"', b'control = "SHAM"'), "arms.control"),
        ((b'experimental = "TABLET"', b'experimental = "DROPS"'), "arms.experimental"),
        ((b"masked = true", b"masked = false"), "arms.masked"),
        ((b'parameter = "DEATHHF"', b'parameter = "DEATH"'), "endpoint.parameter"),
        ((b"sides = 1", b"sides = 2"), "design.sides"),
    ],
)
def test_what_held_looks_rest_on_is_not_amended(change: tuple[bytes, bytes], key: str) -> None:
    with pytest.raises(PlanRefused) as refused:
        refuse_fixed([plan()], plan(plan_with(change)), "plan-2.toml")
    (told,) = str(refused.value).splitlines()
    assert told.startswith(f"{key[0].upper()}{key[1:]} cannot be amended in plan-2.toml. Found ")
    assert ", as it was locked. " in told
    assert FIXED[key].rstrip(".")[1:] in told


def test_looks_held_before_the_file_existed_are_not_amended() -> None:
    """One sentence, whether they are added, changed or left out; no z of theirs is said."""
    bare, with_one = plan(), replace(plan(), held=(HeldLook(1, 100, 1.234, 3.0, 0.001, "Charter"),))
    turned = replace(plan(), held=(HeldLook(1, 100, -1.234, 3.0, 0.001, "Charter"),))
    for before, after, keys in (
        (bare, with_one, "held[1].number, held[1].events, held[1].z"),
        (with_one, bare, "held[1].number, held[1].events, held[1].z"),
        (with_one, turned, "held[1].z than"),
    ):
        with pytest.raises(PlanRefused) as refused:
            refuse_fixed([before], after, "plan-2.toml")
        (told,) = str(refused.value).splitlines()
        start = "Held looks cannot be amended, added or left out in plan-2.toml, [[held]]. Found another "
        assert told.startswith(f"{start}{keys}")
        assert "1.234" not in told


def test_everything_that_is_wrong_is_told_at_once() -> None:
    both = plan_with((b'name = "Q17"', b'name = "Q18"'), (b"sides = 1", b"sides = 2"))
    with pytest.raises(PlanRefused) as refused:
        refuse_fixed([plan()], plan(both), "plan-2.toml")
    assert len(str(refused.value).splitlines()) == 2


def test_values_are_written_as_a_plan_file_would_have_them() -> None:
    assert written((0.5, True, "a", (1, 2))) == '[0.5, true, "a", [1, 2]]'
