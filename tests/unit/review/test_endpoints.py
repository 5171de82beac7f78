"""Harm on an endpoint of its own and further hypotheses, each as a trial of its own would have it."""

from __future__ import annotations

from dataclasses import replace
from functools import cache

from app.model.look import HypothesisResult, LookResult
from app.model.survival import LogrankResult
from app.model.values import Absent
from app.record.canonical import parse_strict
from app.record.text import record_bytes
from app.review import as_used, as_used_of_record
from app.review.as_used import with_bounds_as_used
from app.sequential.rules import hazard_ratio_at
from app.views.closed import full_view
from app.views.record import look_record
from tests.unit.review.invented_trial import patients, plan
from tests.unit.sheets.invented_looks import FURTHER, Held, held

DEATH_ALONE = (
    ('parameter = "RELAPSE"', 'parameter = "DEATH"'),
    ('label = "Relapse"', 'label = "Death from any cause"'),
    ("planned_events = 80", "planned_events = 60"),
    ('spending = "O\'Brien-Fleming-type"', 'spending = "Pocock-type"'),
)
WITH_OTHER_ROWS = (
    "[enrolment]",
    '[harm]\nspending = "Pocock-type"\nalpha = 0.025\nparameter = "RELAPSE"\n[enrolment]',
)


@cache
def looks() -> tuple[Held, ...]:
    return held(plan(FURTHER))


@cache
def of_death_alone() -> tuple[Held, ...]:
    """The same rows under a plan whose endpoint is death, with the hypothesis's events and spending."""
    return held(plan(*DEATH_ALONE, WITH_OTHER_ROWS))


def death(look: Held) -> HypothesisResult:
    (hypothesis,) = look.result.hypotheses
    return hypothesis


def test_a_hypothesis_has_the_numbers_of_a_trial_on_its_endpoint() -> None:
    for look, alone in zip(looks(), of_death_alone(), strict=True):
        further, own = death(look).result, alone.result
        assert further.logrank == own.logrank
        assert further.cox == own.cox
        assert further.information == own.information
        assert further.onwards.repeated_interval == own.onwards.repeated_interval
        assert further.bound.efficacy_z == own.bound.efficacy_z
        assert further.bound.alpha_spent == own.bound.alpha_spent
        assert further.final == own.final


def test_a_hypothesis_without_a_planned_ratio_has_no_conditional_power() -> None:
    assert isinstance(death(looks()[0]).result.onwards.outlook, Absent)


def test_the_plans_own_endpoint_is_untouched_by_what_stands_beside_it() -> None:
    for look, alone in zip(looks(), held(), strict=True):
        assert look.result.logrank == alone.result.logrank
        assert look.result.bound.efficacy_z == alone.result.bound.efficacy_z
        assert look.result.verdict.first_crossed == alone.result.verdict.first_crossed


def waits_for(look: Held) -> str | None:
    (hypothesis,) = full_view(look.result, look.plan).hypotheses
    (reading,) = hypothesis.view.readings
    return reading.waits_for


def test_a_hypothesis_waits_until_the_plans_own_has_crossed() -> None:
    crossed = [look.result.verdict.first_crossed is not None for look in looks()]
    assert set(crossed) == {False, True}
    assert [waits_for(look) for look in looks()] == [None if over else "primary" for over in crossed]
    for look in looks():
        if waits_for(look) is not None:
            assert death(look).result.verdict.first_crossed is None


def test_a_hypothesis_that_waits_for_nothing_is_tested_at_once() -> None:
    beside = (FURTHER[0], FURTHER[1].replace('after = "primary"\n', ""))
    assert [waits_for(look) for look in held(plan(beside))] == [None, None, None, None]


def test_harm_is_judged_by_the_test_on_its_own_endpoint() -> None:
    for look, alone in zip(looks(), of_death_alone(), strict=True):
        harm, own = look.result.harm, alone.result
        assert harm is not None
        assert harm.compared.logrank == own.logrank
        assert harm.information_used == own.information.events
        assert not isinstance(own.logrank, Absent)
        at_bound = hazard_ratio_at(look.result.bound.harm_z, own.logrank.variance, 1)
        assert look.result.bound.harm_hazard_ratio == at_bound
        ahead = [bound.harm_z for bound in look.result.planned]
        assert all(isinstance(z, float) and -3.5 < z < -2.0 for z in ahead)


def test_a_drug_that_kills_crosses_harm_on_death() -> None:
    """The plan's arms exchanged over patients with a strong effect: what helped now harms."""
    under = plan(FURTHER)
    arms = replace(under.arms, control=under.arms.experimental, experimental=under.arms.control)
    harmed = held(replace(under, arms=arms), patients(hazard_ratio=0.1))[:3]
    z = [look.result.harm.z for look in harmed if look.result.harm is not None]
    below = [z <= look.result.bound.harm_z for z, look in zip(z, harmed, strict=True)]  # type: ignore[operator]
    assert [look.result.verdict.crossed == "harm" for look in harmed[:2]] == below[:2]
    assert any(below[:2])


def test_the_record_frozen_with_a_look_gives_back_what_later_looks_rest_on() -> None:
    for look in looks():
        whole: LookResult = look.result
        record = parse_strict(record_bytes(look_record(full_view(whole, look.plan))))
        used = as_used_of_record(record)
        assert used == as_used(whole)
        assert used.of("DEATH") == as_used(death(look).result)
        assert used.z_for_harm == whole.harm.z  # type: ignore[union-attr]
        again = with_bounds_as_used(whole, record)
        assert again.bound == whole.bound
        assert again.hypotheses[0].result.bound == death(look).result.bound


def test_the_bound_of_a_hypothesis_as_used_is_never_computed_again() -> None:
    look = looks()[2]
    record = look_record(full_view(look.result, look.plan))
    record["hypotheses"][0]["boundary"]["efficacy_z"] = 2.75
    assert with_bounds_as_used(look.result, record).hypotheses[0].result.bound.efficacy_z == 2.75
    assert as_used_of_record(record).of("DEATH").efficacy_z == 2.75  # type: ignore[union-attr]


def test_a_hypothesis_that_was_final_while_it_waited_is_decided_by_that_look() -> None:
    """All its events are there at look 2; the plan's own endpoint crosses at look 3."""
    early = (FURTHER[0], FURTHER[1].replace("planned_events = 60", "planned_events = 20"))
    strong = patients(hazard_ratio=0.35)
    looks = held(plan(early, ("planned_events = 80", "planned_events = 150")), strong)
    final = [death(look).result.final for look in looks]
    crossed = next(look.result.number for look in looks if look.result.verdict.crossed == "efficacy")
    first_final = final.index(True) + 1
    assert first_final < crossed
    at_final = death(looks[first_final - 1]).result
    assert isinstance(at_final.logrank, LogrankResult)
    assert at_final.logrank.z >= at_final.bound.efficacy_z  # type: ignore[operator]
    stands = [death(look).result.verdict.first_crossed for look in looks]
    assert stands[: crossed - 1] == [None] * (crossed - 1)
    assert set(stands[crossed - 1 :]) == {first_final}
    for look in looks:
        (view,) = look.view().hypotheses
        assert view.view.readings[0].verdict.first_crossed == death(look).result.verdict.first_crossed
