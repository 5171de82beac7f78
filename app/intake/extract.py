"""Read an extract: the files and columns understood, what was noticed, and the sample if nothing blocks."""

from __future__ import annotations

import hashlib
from collections.abc import Collection, Iterator, Sequence
from dataclasses import dataclass
from datetime import date
from difflib import get_close_matches

import numpy as np

from app.intake.checks import Checked, all_findings
from app.intake.csv_table import TableRefused, read_header
from app.intake.findings import finding
from app.intake.further_endpoints import further_findings
from app.intake.privacy import identifying_columns
from app.intake.readings import censor
from app.intake.rows import (
    NEEDED_PARTS,
    Choice,
    Rows,
    choose,
    endpoint_rows,
    is_endpoint_file,
    missing_columns,
    read_rows,
)
from app.intake.samples import sample_of
from app.model.extract import Extract, Finding, ReadingOfFile, ReceivedFile, Severity
from app.model.plan import Columns, Plan
from app.settings import Limits

TIME_TO_EVENT = "time to event"
KEPT = "kept, not read"

_RANK: dict[Severity, int] = {"block": 0, "doubt": 1, "note": 2}


def received_file(name: str, content: bytes) -> ReceivedFile:
    """A file with the SHA-256 of its bytes."""
    return ReceivedFile(name, content, hashlib.sha256(content).hexdigest())


def read_extract(
    files: Sequence[ReceivedFile], plan: Plan, *, cutoff: date | None, limits: Limits
) -> Extract:
    """What the files hold under the plan. Nothing is raised for what a file contains: it becomes a finding.

    The files with the columns of parameter, time and censoring are read, one after the other; the others are
    kept and listed. Without a cutoff, dates are not compared with one.
    """
    survey = _survey(files, plan.columns)
    findings = list(survey.findings)
    rows = None
    if not any(each.severity == "block" for each in findings):
        rows = _rows(survey, plan, limits, findings)
    if rows is None:
        return Extract(_readings(survey, None), _sorted(findings), None)
    return _understood(survey, rows, plan, cutoff, findings)


@dataclass(frozen=True)
class _Survey:
    """What the headers alone say."""

    files: tuple[ReceivedFile, ...]
    headers: tuple[tuple[str, ...], ...]  # () where a file has none that can be read
    endpoint: tuple[int, ...]
    choice: Choice | None
    findings: tuple[Finding, ...]


def _survey(files: Sequence[ReceivedFile], columns: Columns) -> _Survey:
    headers: list[tuple[str, ...]] = []
    refused: list[tuple[str, Finding]] = []
    for file in files:
        try:
            headers.append(read_header(file))
        except TableRefused as refusal:
            headers.append(())
            refused.append((file.name, refusal.finding))
    endpoint = tuple(at for at, header in enumerate(headers) if is_endpoint_file(columns, header))
    choice = choose(columns, [headers[at] for at in endpoint]) if endpoint else None
    findings = [
        *_file_findings(files),
        *(each for name, each in refused if not endpoint or name.lower().endswith(".csv")),
        *(each for file, header in zip(files, headers, strict=True)
          for each in identifying_columns(header, file.name)),
        *_missing(files, headers, endpoint, choice, columns),
    ]  # fmt: skip
    return _Survey(tuple(files), tuple(headers), endpoint, choice, tuple(findings))


def _file_findings(files: Sequence[ReceivedFile]) -> Iterator[Finding]:
    if not files:
        yield finding(
            "no-file",
            "block",
            "no file",
            "the snapshot",
            "nothing",
            "at least one CSV file",
            "choose the extract",
        )
    names = [file.name for file in files]
    for name in dict.fromkeys(name for name in names if names.count(name) > 1):
        yield finding(
            "file-repeated",
            "block",
            "two files with one name",
            "the snapshot",
            repr(name),
            "each file once",
            "rename one of them, or leave it out",
        )


def _missing(
    files: Sequence[ReceivedFile],
    headers: Sequence[tuple[str, ...]],
    endpoint: Collection[int],
    choice: Choice | None,
    columns: Columns,
) -> Iterator[Finding]:
    """Columns that are not there: in the time-to-event files, or in the file that is nearest to being one."""
    if choice is None:
        needed = {getattr(columns, part) for part in NEEDED_PARTS}
        readable = [at for at, header in enumerate(headers) if header]
        endpoint = sorted(readable, key=lambda at: -len(needed & set(headers[at])))[:1]
        choice = choose(columns, [headers[at] for at in endpoint])
    for at in endpoint:
        yield from missing_columns(choice, headers[at], files[at].name)


def _rows(survey: _Survey, plan: Plan, limits: Limits, findings: list[Finding]) -> Rows | None:
    """All rows of the time-to-event files; None when a file is refused or the endpoint is not among them."""
    if survey.choice is None:
        return None
    try:
        rows = read_rows([survey.files[at] for at in survey.endpoint], survey.choice, limits)
    except TableRefused as refusal:
        findings.append(refusal.finding)
        return None
    absent = [
        _parameter_absent(rows, each.parameter)
        for each in (plan.endpoint, *plan.further_endpoints)
        if each.parameter not in rows.parts["parameter"].texts
    ]
    findings += absent
    return None if absent else rows


def _parameter_absent(rows: Rows, parameter: str) -> Finding:
    texts = rows.parts["parameter"].texts
    nearest = get_close_matches(parameter.upper(), {text.upper() for text in texts}, n=1)
    hint = [text for text in texts if nearest and text.upper() == nearest[0]]
    return finding(
        "parameter-absent",
        "block",
        f"no row of endpoint {parameter!r}",
        rows.where("parameter"),
        ", ".join(map(repr, texts[:5])) + (f" and {len(texts) - 5} more" if len(texts) > 5 else ""),
        "the parameter that the plan names, letter by letter",
        f"correct the plan or the extract{f'; the nearest is {hint[0]!r}' if hint else ''}",
    )


def _understood(
    survey: _Survey, rows: Rows, plan: Plan, cutoff: date | None, findings: list[Finding]
) -> Extract:
    primary, *further = (
        Checked(endpoint_rows(rows.of_parameter(each.parameter)), plan.on(each), cutoff)
        for each in (plan.endpoint, *plan.further_endpoints)
    )
    findings += all_findings(primary)
    told = {each.id for each in findings}
    for each in further:
        findings += further_findings(each, primary, told)
    blocked = any(each.severity == "block" for each in findings)
    samples = [] if blocked else [sample_of(each.endpoint, each.plan) for each in (primary, *further)]
    return Extract(
        files=_readings(survey, rows),
        findings=_sorted(findings),
        sample=samples[0] if samples else None,
        further=tuple(samples[1:]),
        parameters=_parameters(rows),
    )


def _parameters(rows: Rows) -> tuple[tuple[str, int, int], ...]:
    """Every endpoint by its code, with its rows and events."""
    column = rows.parts["parameter"]
    event = rows.parts["censor"].where(lambda text: censor(text) == 0)
    n_rows = np.bincount(column.codes, minlength=len(column.texts))
    n_events = np.bincount(column.codes[event], minlength=len(column.texts))
    return tuple(sorted(zip(column.texts, n_rows.tolist(), n_events.tolist(), strict=True)))


def _readings(survey: _Survey, rows: Rows | None) -> tuple[ReadingOfFile, ...]:
    read = survey.choice.names if survey.choice and rows is not None else frozenset()
    counts = np.bincount(rows.file, minlength=len(survey.endpoint)).tolist() if rows is not None else []
    n_rows = dict(zip(survey.endpoint, counts, strict=False))
    return tuple(
        ReadingOfFile(
            name=file.name,
            digest=file.digest,
            n_rows=n_rows.get(at, 0),
            columns_read=tuple(name for name in header if name in read and at in survey.endpoint),
            columns_left_out=tuple(name for name in header if name not in read or at not in survey.endpoint),
            role=TIME_TO_EVENT if at in survey.endpoint else KEPT,
        )
        for at, (file, header) in enumerate(zip(survey.files, survey.headers, strict=True))
    )


def _sorted(findings: Sequence[Finding]) -> tuple[Finding, ...]:
    """What blocks first, then doubts, then notes; else in the order of the checks."""
    return tuple(sorted(findings, key=lambda each: _RANK[each.severity]))
