"""What is checked in the rows of the endpoint. Each check gives findings; none changes a value."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from datetime import date
from difflib import get_close_matches

import numpy as np

from app.intake import readings
from app.intake.findings import finding, quoted
from app.intake.polarity import polarity
from app.intake.privacy import identifying_values
from app.intake.rows import EndpointRows
from app.intake.samples import stratum_indices
from app.intake.time_unit import time_findings
from app.model.extract import Finding, Severity
from app.model.plan import Plan
from app.model.values import Bools, Ints

DAYS_OF_SILENCE = 92  # a cutoff this long after the last follow-up was probably mistyped

Findings = Iterator[Finding]


@dataclass(frozen=True, eq=False)
class Checked:
    """The endpoint's rows, under which plan, and up to which cutoff (None where none was given)."""

    endpoint: EndpointRows
    plan: Plan
    cutoff: date | None

    def column(self, part: str) -> str:
        return self.endpoint.rows.choice.parts[part]

    def in_arm(self, name: str) -> Bools:
        return self.endpoint.rows.parts["arm"].where(lambda text: text == name)


def all_findings(checked: Checked) -> Findings:
    for check in CHECKS:
        yield from check(checked)


def subjects(checked: Checked) -> Findings:
    rows = checked.endpoint.rows
    subject, name = rows.parts["subject"], checked.column("subject")
    blank = subject.where(readings.is_blank)
    yield from rows.findings(
        blank,
        "subject-missing",
        "block",
        "subject identifier missing",
        name,
        accepted="an identifier in each row",
        remedy="complete the rows",
    )
    repeated = (np.bincount(subject.codes, minlength=len(subject.texts)) > 1)[subject.codes] & ~blank
    yield from rows.findings(
        repeated,
        "subject-repeated",
        "block",
        "subject listed more than once",
        name,
        accepted=f"one row for each subject under {checked.plan.endpoint.parameter!r}",
        remedy="keep one row of each subject",
    )


def studies(checked: Checked) -> Findings:
    rows = checked.endpoint.rows
    study = rows.parts.get("study")
    if study is None or len(study.texts) < 2:
        return
    counts = np.bincount(study.codes)
    yield from rows.findings(
        study.codes != counts.argmax(),
        "study-differs",
        "doubt",
        "more than one study",
        checked.column("study"),
        accepted=f"one study; most rows carry {quoted(study.texts[counts.argmax()])}",
        remedy="the rows are analysed; ask the data centre whether they belong to this trial",
        value=study.quoted_at,
    )


def arms(checked: Checked) -> Findings:
    rows, plan = checked.endpoint.rows, checked.plan.arms
    arm, name = rows.parts["arm"], checked.column("arm")
    known = (plan.control, plan.experimental)
    unknown = [text for text in arm.texts if text not in known]
    yield from rows.findings(
        arm.where(lambda text: text not in known),
        "arm-unknown",
        "block",
        "treatment that is not an arm of the plan",
        name,
        accepted=f"{known[0]!r} or {known[1]!r}, letter by letter",
        remedy=_arm_remedy(unknown, known),
        value=arm.quoted_at,
    )
    for each in known if not unknown else ():
        if each not in arm.texts:
            yield finding(
                "arm-empty",
                "block",
                "arm without subjects",
                rows.where("arm"),
                f"no row with {each!r}",
                "subjects in both arms",
                "correct the arms of the plan, or have the extract completed",
            )


def _arm_remedy(unknown: list[str], known: tuple[str, str]) -> str:
    matches = [
        (text, get_close_matches(text.strip().upper(), map(str.upper, known), n=1)) for text in unknown
    ]
    near = [text for text, found in matches if found]
    if near and len(near) == len(unknown):
        return f"correct the rows; {quoted(near[0])} is nearly the name of an arm"
    return "correct the rows or the plan; a third arm is not supported"


def censoring(checked: Checked) -> Findings:
    endpoint = checked.endpoint
    text = endpoint.rows.parts["censor"]
    yield from endpoint.rows.findings(
        endpoint.censor == readings.NO_CENSOR,
        "censor-unreadable",
        "block",
        "censoring value that cannot be read",
        checked.column("censor"),
        accepted="0 for an event, whole numbers above 0 for censored follow-up (ADaM)",
        remedy="correct the rows",
        value=text.quoted_at,
    )
    yield from polarity(endpoint, checked.plan.endpoint, checked.cutoff)
    if (endpoint.censor > 0).any() and not endpoint.event.any():
        yield finding(
            "no-events",
            "note",
            "no event yet",
            endpoint.rows.where("censor"),
            f"0 events in {len(endpoint.rows):,} subjects",
            "0 marks an event",
            "nothing can be compared before the first event",
        )


def times(checked: Checked) -> Findings:
    endpoint = checked.endpoint
    text = endpoint.rows.parts["time"]
    blank = text.where(readings.is_blank)

    def told(at: Bools, id: str, severity: Severity, what: str, remedy: str) -> Findings:
        return endpoint.rows.findings(
            at,
            id,
            severity,
            what,
            checked.column("time"),
            accepted="a number above 0, with a decimal point",
            remedy=remedy,
            value=text.quoted_at,
        )

    unread = np.isnan(endpoint.time) & ~blank
    yield from told(blank, "time-missing", "block", "time missing", "complete the rows")
    yield from told(unread, "time-unreadable", "block", "time that is not a number", "correct the rows")
    yield from told(endpoint.time < 0, "time-negative", "block", "negative time", "correct the rows")
    yield from told(
        endpoint.time == 0,
        "time-zero",
        "doubt",
        "time 0",
        "the rows are analysed at time 0; ask the data centre whether follow-up began",
    )
    yield from time_findings(endpoint)


def dates(checked: Checked) -> Findings:
    """Missing and unreadable dates: a column that the plan names blocks, ADaM's own by default is a doubt."""
    endpoint = checked.endpoint
    for part, days in (("start", endpoint.start), ("end", endpoint.end)):
        if days is None:
            continue
        text = endpoint.rows.parts[part]
        named = getattr(checked.plan.columns, part) is not None
        yield from endpoint.rows.findings(
            days == readings.NO_DAY,
            "date-unreadable",
            "block" if named else "doubt",
            "date missing or not readable",
            checked.column(part),
            accepted="a date written yyyy-mm-dd",
            remedy="correct the rows" if named else "the column is not used while one row has no date",
            value=text.quoted_at,
        )


def order_of_dates(checked: Checked) -> Findings:
    """Start, end and cutoff follow each other; what has no date takes no part."""
    endpoint, cutoff = checked.endpoint, checked.cutoff
    if endpoint.start is not None and endpoint.end is not None:
        both = _known(endpoint.start) & _known(endpoint.end)
        yield from _misplaced(
            checked, "end", both & (endpoint.end < endpoint.start), "end-before-start",
            "follow-up that ends before it starts", f"a date not before {checked.column('start')}",
        )  # fmt: skip
    if cutoff is None:
        return
    last, not_after = readings.day_of(cutoff), f"a date not after the data cutoff {cutoff}"
    if endpoint.start is not None:
        late = _known(endpoint.start) & (endpoint.start > last)
        yield from _misplaced(
            checked, "start", late, "start-after-cutoff", "start after the data cutoff", not_after
        )
    if endpoint.end is not None:
        late = _known(endpoint.end) & (endpoint.end > last)
        yield from _misplaced(
            checked, "end", late & endpoint.event, "event-after-cutoff",
            "event after the data cutoff", not_after,
        )  # fmt: skip
        yield from _misplaced(
            checked, "end", late & ~endpoint.event, "follow-up-after-cutoff",
            "follow-up that runs past the data cutoff", not_after,
        )  # fmt: skip


def _known(days: Ints) -> Bools:
    return np.not_equal(days, readings.NO_DAY)


def _misplaced(checked: Checked, part: str, at: Bools, id: str, what: str, accepted: str) -> Findings:
    text = checked.endpoint.rows.parts[part]
    return checked.endpoint.rows.findings(
        at,
        id,
        "block",
        what,
        checked.column(part),
        accepted=accepted,
        remedy="correct the rows, or the cutoff" if "cutoff" in id else "correct the rows",
        value=text.at,
    )


def calendar(checked: Checked) -> Findings:
    """Dates against the trial's start and against a cutoff that is far from them."""
    endpoint, begun = checked.endpoint, checked.plan.trial.start_date
    if endpoint.start is not None and begun is not None:
        text = endpoint.rows.parts["start"]
        yield from endpoint.rows.findings(
            _known(endpoint.start) & (endpoint.start < readings.day_of(begun)),
            "start-before-trial",
            "doubt",
            "start before the trial began",
            checked.column("start"),
            accepted=f"a date not before {begun}, the plan's start_date",
            remedy="the rows are analysed; ask the data centre for the date of randomisation",
            value=text.at,
        )
    if checked.cutoff is None:
        return
    if endpoint.end is None:
        yield _cutoff_not_checked(checked)
    elif _known(endpoint.end).any() and (endpoint.censor > 0).any():
        last = int(endpoint.end.max())
        if last < readings.day_of(checked.cutoff) - DAYS_OF_SILENCE:
            yield _cutoff_far_away(checked, readings.date_of(last))


def _cutoff_not_checked(checked: Checked) -> Finding:
    return finding(
        "cutoff-not-checked",
        "note",
        "the data cutoff cannot be checked",
        ", ".join(checked.endpoint.rows.files),
        "no column with the date of event or censoring",
        "ADT, or the column that the plan names as end",
        "nothing to mend where the data centre has applied the cutoff",
    )


def _cutoff_far_away(checked: Checked, last: date) -> Finding:
    return finding(
        "cutoff-far-from-data",
        "doubt",
        "the data end long before the data cutoff",
        checked.endpoint.rows.where("end"),
        f"the last date {last}, the cutoff {checked.cutoff}",
        f"follow-up to within {DAYS_OF_SILENCE} days of the cutoff",
        "check the cutoff, or say why there is no later follow-up",
    )


def strata(checked: Checked) -> Findings:
    rows, arms = checked.endpoint.rows, checked.plan.arms
    for name, column in zip(rows.choice.strata, rows.strata, strict=True):
        yield from rows.findings(
            column.where(readings.is_blank),
            "stratum-missing",
            "block",
            "stratum missing",
            name,
            accepted="a level in each row, as randomised",
            remedy="complete the rows",
        )
    arms_there = all(arm in rows.parts["arm"].texts for arm in (arms.control, arms.experimental))
    complete = not any(column.where(readings.is_blank).any() for column in rows.strata)
    if rows.strata and arms_there and complete:
        yield from _lonely_strata(checked)


def _lonely_strata(checked: Checked) -> Findings:
    """Strata with subjects of one arm only; which arm is not told."""
    rows, arms = checked.endpoint.rows, checked.plan.arms
    index, labels = stratum_indices(rows)
    control, experimental = (
        np.bincount(index[checked.in_arm(arm)], minlength=len(labels))
        for arm in (arms.control, arms.experimental)
    )
    lonely = [
        label for label, a, b in zip(labels, control, experimental, strict=True) if (a == 0) != (b == 0)
    ]
    if lonely:
        yield finding(
            "stratum-one-arm",
            "note",
            "strata with one arm only",
            f"{', '.join(rows.files)}, column {' and '.join(rows.choice.strata)}",
            f"{len(lonely)} of {len(labels)} strata: {', '.join(map(quoted, lonely[:5]))}",
            "both arms in each stratum",
            "such a stratum adds nothing to the stratified test",
        )


def contacts(checked: Checked) -> Findings:
    return identifying_values(checked.endpoint.rows)


CHECKS: tuple[Callable[[Checked], Findings], ...] = (
    subjects,
    arms,
    censoring,
    times,
    dates,
    order_of_dates,
    strata,
    contacts,
    studies,
    calendar,
)
