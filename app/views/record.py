"""The record of a closed view: the names of app/record/schema.py filled in, oriented as the view is."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import asdict
from datetime import date

from app.model.boundary import HeldCompared, LookAsUsed
from app.model.extract import Changes, Finding
from app.model.look import ArmCounts, CalendarCounts
from app.model.outlook import WhatIf
from app.model.survival import CoxResult, LogrankResult
from app.model.values import Absent, Estimate
from app.record.numbers import Record, column, estimate, not_estimable
from app.sequential.gatekeeping import family_alpha
from app.views.closed import ArmView, ClosedView
from app.views.outlook_record import chosen_record, outlook_record, part_record
from app.views.reading import Reading
from app.views.record_parts import bound_record, envelope, finding_record, hypothesis_record
from app.views.shape_record import shape_record


def looks_record(
    kind: str,
    views: Sequence[ClosedView],
    *,
    run_at: str,
    plan_findings: Sequence[Finding] = (),
) -> Record:
    """The record of one or several looks under one plan; all views share plan and orientation."""
    first = views[0]
    digests = [digest for view in views for digest in view.look.snapshot_digests]
    of_looks = (finding for view in views for finding in view.look.findings)
    findings = [finding_record(finding) for finding in (*plan_findings, *of_looks)]
    orientation = {"of": first.of.value, "against": first.against.value}
    common = envelope(kind, first.look.plan_digest, digests, orientation, run_at, findings)
    looks = [look_record(view) for view in views]
    held = [_compared(look) for look in first.look.held]
    return {**common, "held": held or None, "looks": looks}


def evaluation_record(
    views: Sequence[ClosedView],
    what_ifs: Sequence[WhatIf | None],
    *,
    run_at: str,
    plan_findings: Sequence[Finding] = (),
) -> Record:
    """The record that `evaluate` prints: that of the looks, and for each what was asked of it besides.

    The views are unmasked, with one reading each.
    """
    record = looks_record("evaluation", views, run_at=run_at, plan_findings=plan_findings)
    for look, asked in zip(record["looks"], what_ifs, strict=True):
        if "conditional_power" in look["outlook"]:
            look["outlook"]["conditional_power"]["chosen"] = None if asked is None else chosen_record(asked)
    return record


def _compared(held: HeldCompared) -> Record:
    """A look of the plan's [[held]]: as used, what we compute for it, and the differences."""
    ours, theirs = held.computed_efficacy_z, held.efficacy_z
    difference: Estimate | None = None
    if theirs is not None:
        difference = ours if isinstance(ours, Absent) else theirs - ours
    return {
        "number": held.number,
        "events": held.events,
        "source": held.source,
        "z": held.z,
        "efficacy_z": theirs,
        "computed_efficacy_z": estimate(ours),
        "difference": estimate(difference),
        "alpha_spent": held.alpha_spent,
        "computed_alpha_spent": held.computed_alpha_spent,
        "alpha_difference": held.alpha_spent - held.computed_alpha_spent,
    }


def look_record(view: ClosedView) -> Record:
    """One look: the plan's own endpoint, harm's where that is another, and each further hypothesis."""
    hypotheses = [
        {**hypothesis_record(each.hypothesis), **_endpoint_record(each.view)} for each in view.hypotheses
    ]
    return {
        **_endpoint_record(view),
        "harm_endpoint": _harm_endpoint(view),
        "hypotheses": hypotheses or None,
        "alpha_of_all": family_alpha(view.plan.design.alpha, view.plan.hypotheses),
    }


def _harm_endpoint(view: ClosedView) -> Record | None:
    harm = view.harm
    if harm is None:
        return None
    only = None if view.masked else view.readings[0]
    return {
        "parameter": harm.parameter,
        "information": harm.information_used,
        "arms": [_counts(arm, counts) for arm, counts in zip(view.arms, harm.counts, strict=True)],
        "logrank": _logrank(harm.logrank, harm.stratum_labels, only),
        "cox": _cox(harm.cox),
    }


def _counts(arm: ArmView, counts: ArmCounts) -> Record:
    return {
        "arm": arm.value,
        "subjects": counts.subjects,
        "events": counts.events,
        "person_time": counts.person_time,
        "follow_up_median": estimate(counts.follow_up_median),
    }


def _endpoint_record(view: ClosedView) -> Record:
    """The plan's own endpoint at a look, or that of a further hypothesis."""
    look = view.look
    sides = view.plan.design.sides
    only = None if view.masked else view.readings[0]
    labels = [stratum.label for stratum in look.information.strata]
    return {
        "number": look.number,
        "kind": look.kind,
        "final": look.final,
        "time_unit": look.time_unit,
        "cutoff": _iso(look.cutoff),
        "extracted": _iso(look.extracted),
        "information": _information(view),
        "changes": _changes(look.changes),
        "calendar": _calendar(look.calendar),
        "logrank": _logrank(view.logrank, labels, only),
        "logrank_unstratified": _logrank(view.logrank_unstratified, [""], only),
        "cox": _cox(view.cox),
        "cox_unstratified": _cox(view.cox_unstratified),
        "curves": [_curve(arm) for arm in view.arms],
        "boundary": {
            **bound_record(look.bound, sides),
            "information": look.information_used,
            **_crossing(only),
        },
        "readings": [_reading(reading, look.final) for reading in view.readings] if view.masked else None,
        "history": [_held(held, view) for held in view.readings[0].history],
        "ahead": [bound_record(bound, sides) for bound in look.planned],
        **(_onwards(only, look.final) if only else {"outlook": None, "stopping": None}),
        "repeated_interval": part_record(view.readings[0].onwards.repeated_interval),
        **shape_record(view),
    }


def _iso(day: date | None) -> str | None:
    return None if day is None else day.isoformat()


def _information(view: ClosedView) -> Record:
    information = view.look.information
    return {
        "subjects": information.subjects,
        "events": information.events,
        "fraction": information.fraction,
        "planned_events": information.planned_events,
        "planned_subjects": view.plan.enrolment.planned_subjects,
        "score_variance": estimate(information.score_variance),
        "variance_ratio": estimate(information.variance_ratio),
        "arms": [_counts(arm, arm.counts) for arm in view.arms],
        "strata": [_stratum(view, index) for index in range(len(view.strata))],
    }


def _stratum(view: ClosedView, index: int) -> Record:
    stratum = view.strata[index]
    arms = [
        {"arm": arm.value, "subjects": subjects, "events": events}
        for arm, (subjects, events) in zip(view.arms, stratum.arms, strict=True)
    ]
    return {"label": stratum.label, "subjects": stratum.subjects, "events": stratum.events, "arms": arms}


def _changes(changes: Changes | None) -> Record | None:
    """Counts only: identifiers stay on the page and in the extract."""
    if changes is None:
        return None
    return {
        "subjects_in_both": changes.n_common,
        "new_subjects": len(changes.new_subjects),
        "vanished_subjects": len(changes.vanished_subjects),
        "new_events": len(changes.new_events),
        "reversed_events": len(changes.reversed_events),
        "moved_events": len(changes.moved_events),
        "changed_arm": len(changes.changed_arm),
        "changed_stratum": len(changes.changed_stratum),
        "new_subjects_with_event": len(changes.new_subjects_with_event),
        "vanished_with_event": len(changes.vanished_with_event),
    }


def _calendar(calendar: CalendarCounts | None) -> Record | None:
    if calendar is None:
        return None
    return {
        "day": calendar.day.tolist(),
        "randomised": calendar.randomised.tolist(),
        "events": calendar.events.tolist(),
    }


def _logrank(result: LogrankResult | Absent, labels: Sequence[str], only: Reading | None) -> Record:
    if isinstance(result, Absent):
        return not_estimable(result.reason)
    return {
        "observed": result.observed,
        "expected": result.expected,
        "variance": result.variance,
        "z": result.z,
        "chi_square": result.chi_square,
        "p_one_sided": result.p_one_sided if only else None,
        "p_two_sided": result.p_two_sided,
        "strata": [
            {
                "label": labels[part.stratum],
                "subjects": part.subjects,
                "events": part.events,
                "observed": part.observed,
                "expected": part.expected,
                "variance": part.variance,
            }
            for part in result.strata
        ],
    }


def _cox(result: CoxResult | Absent) -> Record:
    return not_estimable(result.reason) if isinstance(result, Absent) else asdict(result)


def _curve(arm: ArmView) -> Record:
    curve = arm.curve
    return {
        "arm": arm.value,
        "time": curve.time.tolist(),
        "at_risk": curve.at_risk.tolist(),
        "events": curve.events.tolist(),
        "censored": curve.censored.tolist(),
        "survival": curve.survival.tolist(),
        "std_error": column(curve.std_error),
        "ci_low": column(curve.ci_low),
        "ci_high": column(curve.ci_high),
        "interval": curve.interval,
        "level": curve.level,
        "median": estimate(curve.median),
        "median_ci_low": estimate(curve.median_ci_low),
        "median_ci_high": estimate(curve.median_ci_high),
        "follow_up_median": estimate(arm.counts.follow_up_median),
    }


def _onwards(reading: Reading, final: bool) -> Record:
    """Going on; and, where a bound was crossed here or the look is final, ending here."""
    onwards, ends_here = reading.onwards, final or reading.verdict.crossed != "none"
    return {
        "outlook": outlook_record(onwards.outlook),
        "stopping": part_record(onwards.stopping) if ends_here else None,
    }


def _crossing(reading: Reading | None) -> Record:
    """Masked, what is crossed depends on the reading and stands there only."""
    if reading is None:
        return {"crossed": None, "first_crossed": None, "waits_for": None}
    stands = reading.verdict
    return {
        "crossed": stands.crossed,
        "first_crossed": stands.first_crossed,
        "waits_for": reading.waits_for,
    }


def _reading(reading: Reading, final: bool) -> Record:
    return {
        "experimental": reading.experimental,
        "z": estimate(reading.z),
        "p_one_sided": estimate(reading.p_one_sided),
        "z_for_harm": reading.z_for_harm,
        **_crossing(reading),
        **_onwards(reading, final),
    }


def _held(held: LookAsUsed, view: ClosedView) -> Record:
    return {
        "number": held.number,
        "kind": held.kind,
        "information": held.information,
        "events": held.events,
        "fraction": held.fraction,
        "z": held.z,
        "efficacy_z": estimate(held.efficacy_z),
        "efficacy_hazard_ratio": estimate(held.efficacy_hazard_ratio),
        "alpha_spent": held.alpha_spent,
        "final": held.final,
        "crossed": None if view.masked else held.crossed,
        "futility_z": estimate(held.futility_z),
        "harm_z": estimate(held.harm_z),
        "z_for_harm": held.z_for_harm,
    }
