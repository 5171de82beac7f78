"""The plan's further endpoints: checked as the plan's own is, then held against it subject by subject."""

from __future__ import annotations

from collections.abc import Collection, Iterator
from dataclasses import replace

import numpy as np

from app.intake.checks import Checked, all_findings
from app.intake.csv_table import TextColumn
from app.intake.findings import finding
from app.model.extract import Finding
from app.model.values import Bools, Ints


def further_findings(further: Checked, primary: Checked, told: Collection[str]) -> Iterator[Finding]:
    """What is noticed in the rows of one further endpoint; of notes only those whose id is not `told` yet."""
    for each in all_findings(further):
        if each.severity != "note" or each.id not in told:
            yield replace(each, where=f"{each.where}, rows of {further.plan.endpoint.parameter!r}")
    yield from _subjects(further, primary)
    yield from _arms(further, primary)
    yield from _strata(further, primary)


def _subjects(further: Checked, primary: Checked) -> Iterator[Finding]:
    """Both endpoints are of all randomised subjects: one that lacks some is analysed on others."""
    here, there = _subject(further), _subject(primary)
    one, other = further.plan.endpoint.parameter, primary.plan.endpoint.parameter
    lacking, beyond = len({*there.texts} - {*here.texts}), len({*here.texts} - {*there.texts})
    if lacking or beyond:
        yield finding(
            "subjects-differ",
            "doubt",
            "two endpoints on different subjects",
            further.endpoint.rows.where("subject"),
            f"{lacking:,} subjects of {other!r} without a row of {one!r}, {beyond:,} the other way round",
            "a row of each endpoint for every subject randomised",
            "each endpoint is analysed on its own rows; ask the data centre for the missing ones",
        )


def _arms(further: Checked, primary: Checked) -> Iterator[Finding]:
    arm = further.endpoint.rows.parts["arm"]
    yield from further.endpoint.rows.findings(
        _differs(further, primary, arm, primary.endpoint.rows.parts["arm"]),
        "arm-differs",
        "block",
        "subject in another arm than under the plan's endpoint",
        further.column("arm"),
        accepted="one arm for each subject",
        remedy="have the data centre correct the rows",
        value=arm.quoted_at,
    )


def _strata(further: Checked, primary: Checked) -> Iterator[Finding]:
    rows = further.endpoint.rows
    for name, here, there in zip(rows.choice.strata, rows.strata, primary.endpoint.rows.strata, strict=True):
        yield from rows.findings(
            _differs(further, primary, here, there),
            "stratum-differs",
            "doubt",
            "subject in another stratum than under the plan's endpoint",
            name,
            accepted="one level for each subject, as randomised",
            remedy="each endpoint is stratified by its own rows; ask the data centre which level is right",
            value=here.quoted_at,
        )


def _subject(checked: Checked) -> TextColumn:
    return checked.endpoint.rows.parts["subject"]


NOT_THERE = -1


def _in_codes_of(other: TextColumn, column: TextColumn) -> Ints:
    """For each row of `column` the code that `other` has for its text, or NOT_THERE."""
    code = {text: at for at, text in enumerate(other.texts)}
    return np.array([code.get(text, NOT_THERE) for text in column.texts], dtype=np.int64)[column.codes]


def _differs(further: Checked, primary: Checked, here: TextColumn, there: TextColumn) -> Bools:
    """True in the rows of `further` whose subject has another text under the plan's endpoint."""
    subject = _subject(primary)
    by_subject = np.full(len(subject.texts), NOT_THERE, dtype=np.int64)
    by_subject[subject.codes] = there.codes
    known = _in_codes_of(subject, _subject(further))
    elsewhere = np.where(known == NOT_THERE, NOT_THERE, by_subject[known])
    differs: Bools = (elsewhere != NOT_THERE) & (elsewhere != _in_codes_of(there, here))
    return differs
