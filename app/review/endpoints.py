"""The whole of one look: the plan's endpoint, harm where it has its own, and each further hypothesis."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace

from app.model.boundary import LookAsUsed
from app.model.extract import Sample
from app.model.look import HarmResult, HypothesisResult, LookResult, Onwards
from app.model.plan import Hypothesis, Plan
from app.model.values import Absent
from app.review.comparison import compare_arms
from app.review.counts import arm_counts, times_of
from app.review.look import LookDeclared, review_endpoint
from app.sequential.gatekeeping import PRIMARY, gated_history, gated_verdict, in_testing_order, opened_at

NO_RATIO_PLANNED = Absent("the plan gives this hypothesis no hazard ratio")


def review_look(
    plan: Plan,
    sample: Sample,
    declared: LookDeclared,
    past: Sequence[LookAsUsed],
    further: Sequence[Sample] = (),
) -> LookResult:
    """Compute everything of one look.

    `past` are the looks as used, in order; `further` the samples of the plan's further endpoints. The bound
    does not depend on what earlier looks crossed: a crossing depends on which arm is experimental, and the
    masked view reads the same bound both ways.
    """
    samples = {each.parameter: each for each in further}
    primary = review_endpoint(plan, sample, declared, past, _harm(plan, samples))
    return replace(primary, hypotheses=_hypotheses(plan, samples, declared, past, primary))


def _harm(plan: Plan, samples: Mapping[str, Sample]) -> HarmResult | None:
    """The test that the harm boundary is for, stratified as the plan's own, its events counted as bad."""
    endpoint = plan.harm_endpoint
    if endpoint is None:
        return None
    sample = samples[endpoint.parameter]
    compared, mirrored = compare_arms(plan.on(endpoint), sample)
    control, experimental = (
        arm_counts(times_of(sample)[arm], sample.event[arm])
        for arm in (~sample.experimental, sample.experimental)
    )
    test = compared.logrank
    if isinstance(test, Absent):
        used = 0.0  # what gives no z tells nothing of harm
    else:
        used = float(sample.event.sum()) if plan.design.information == "events" else test.variance
    labels = sample.stratum_labels
    return HarmResult(endpoint.parameter, control, experimental, used, labels, compared, mirrored)


def _hypotheses(
    plan: Plan,
    samples: Mapping[str, Sample],
    declared: LookDeclared,
    past: Sequence[LookAsUsed],
    primary: LookResult,
) -> tuple[HypothesisResult, ...]:
    """Each further hypothesis in the order of the plan, none before the one that it waits for."""
    opened = {PRIMARY: opened_at(past, primary.verdict, declared.number)}
    reviewed: dict[str, HypothesisResult] = {}
    for hypothesis in in_testing_order(plan.hypotheses):
        own_past = held = _own_past(past, hypothesis)
        gate = None if hypothesis.after is None else opened[hypothesis.after]
        result = _hypothesis(plan, hypothesis, samples[hypothesis.parameter], declared, own_past, gate)
        if hypothesis.after is not None:
            held = gated_history(own_past, gate, plan.design.sides)
        opened[hypothesis.name] = opened_at(held, result.verdict, declared.number, gate=gate or 0)
        reviewed[hypothesis.name] = HypothesisResult(hypothesis, result)
    return tuple(reviewed[each.name] for each in plan.hypotheses)


def _own_past(past: Sequence[LookAsUsed], hypothesis: Hypothesis) -> tuple[LookAsUsed, ...]:
    held = (look.of(hypothesis.parameter) for look in past)
    return tuple(look for look in held if look is not None)


def _hypothesis(
    plan: Plan,
    hypothesis: Hypothesis,
    sample: Sample,
    declared: LookDeclared,
    past: Sequence[LookAsUsed],
    gate: int | None,
) -> LookResult:
    """One further hypothesis by its own plan; while it waits nothing is crossed."""
    own = plan.for_hypothesis(hypothesis)
    result = review_endpoint(own, sample, replace(declared, findings=(), changes=None), past)
    if hypothesis.after is not None:
        z = None if isinstance(result.logrank, Absent) else result.logrank.z
        stands = gated_verdict(past, z, result.bound, own.design.sides, gate)
        result = replace(result, verdict=stands)
    return replace(
        result,
        onwards=_without_outlook(result.onwards),
        mirrored_onwards=_without_outlook(result.mirrored_onwards),
    )


def _without_outlook(onwards: Onwards) -> Onwards:
    """Conditional power needs an effect that the plan names, and it names none for a further hypothesis."""
    return replace(onwards, outlook=NO_RATIO_PLANNED)
