"""Samples made of read rows, the pooled sample made without the arm, and what changed between two samples."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from app.errors import ValueRejected
from app.intake import readings
from app.intake.csv_table import read_header
from app.intake.rows import (
    POOLED_PARTS,
    EndpointRows,
    Rows,
    choose,
    endpoint_rows,
    is_endpoint_file,
    read_rows,
)
from app.intake.time_unit import time_unit
from app.model.extract import Changes, PooledSample, ReceivedFile, Sample
from app.model.plan import Plan
from app.model.values import Bools, Ints, read_only
from app.settings import Limits

ONE_STRATUM = "All subjects"


def stratum_indices(rows: Rows) -> tuple[Ints, tuple[str, ...]]:
    """The stratum of each row and the labels, `North / No`, sorted by their levels in the plan's order."""
    if not rows.strata:
        return np.zeros(len(rows), dtype=np.int64), (ONE_STRATUM,)
    combined = np.zeros(len(rows), dtype=np.int64)
    for column in rows.strata:
        combined = combined * len(column.texts) + column.codes
    used, first, inverse = np.unique(combined, return_index=True, return_inverse=True)
    levels = [tuple(column.at(row) for column in rows.strata) for row in first]
    order = sorted(range(used.size), key=lambda at: levels[at])
    rank = np.empty(used.size, dtype=np.int64)
    rank[order] = np.arange(used.size)
    return rank[inverse.ravel()], tuple(" / ".join(levels[at]) for at in order)


def sample_of(endpoint: EndpointRows, plan: Plan) -> Sample:
    """The closed side's sample, of rows in which no finding blocks."""
    rows = endpoint.rows
    stratum, labels = stratum_indices(rows)
    subject = rows.parts["subject"]
    return Sample(
        parameter=plan.endpoint.parameter,
        subject=tuple(subject.texts[code] for code in subject.codes.tolist()),
        time=read_only(endpoint.time, np.float64),
        event=read_only(endpoint.event, np.bool_),
        experimental=read_only(
            rows.parts["arm"].where(lambda text: text == plan.arms.experimental), np.bool_
        ),
        stratum=read_only(stratum, np.int64),
        stratum_labels=labels,
        time_unit=time_unit(endpoint),
        start_day=_whole(endpoint.start),
        end_day=_whole(endpoint.end),
    )


def _whole(days: Ints | None) -> Ints | None:
    """The days of a column in which every row has a date; None otherwise."""
    if days is None or (days == readings.NO_DAY).any():
        return None
    return read_only(days, np.int64)


def read_pooled(files: Sequence[ReceivedFile], plan: Plan, *, limits: Limits) -> PooledSample:
    """The open side's sample: the columns of arm, subject and event text are never taken from the files.

    The rows are sorted by what they hold, so that not even the order received, which may follow the arms,
    is left. `files` are those of a snapshot that was received; ValueRejected when they hold no such rows.
    """
    endpoint_files = _endpoint_files(files, plan)
    headers = [read_header(file) for file in endpoint_files]
    choice = choose(plan.columns, headers).only(POOLED_PARTS)
    parameter = plan.endpoint.parameter
    endpoint = endpoint_rows(read_rows(endpoint_files, choice, limits).of_parameter(parameter))
    unread = (endpoint.censor == readings.NO_CENSOR) | ~(endpoint.time >= 0)
    if not len(endpoint.rows) or unread.any():
        raise ValueRejected(
            "rows that cannot be read",
            where=", ".join(file.name for file in endpoint_files),
            found=f"{int(unread.sum()):,} of {len(endpoint.rows):,} rows",
            accepted="an extract without blocking findings",
            remedy="receive a mended extract",
        )
    return _pooled(endpoint, parameter)


def _endpoint_files(files: Sequence[ReceivedFile], plan: Plan) -> list[ReceivedFile]:
    found = [file for file in files if _is_endpoint_file(file, plan)]
    if not found:
        raise ValueRejected(
            "no time-to-event file",
            where="the snapshot",
            found=f"{len(files)} other files",
            accepted="a CSV file with the columns of the plan",
            remedy="receive a mended extract",
        )
    return found


def _is_endpoint_file(file: ReceivedFile, plan: Plan) -> bool:
    try:
        return is_endpoint_file(plan.columns, read_header(file))
    except ValueRejected:
        return False


def _pooled(endpoint: EndpointRows, parameter: str) -> PooledSample:
    stratum, labels = stratum_indices(endpoint.rows)
    start, end = _whole(endpoint.start), _whole(endpoint.end)
    nothing = np.zeros(len(endpoint.rows), dtype=np.int64)
    order = np.lexsort(
        (
            end if end is not None else nothing,
            start if start is not None else nothing,
            stratum,
            ~endpoint.event,
            endpoint.time,
        )
    )
    return PooledSample(
        parameter=parameter,
        time=read_only(endpoint.time[order], np.float64),
        event=read_only(endpoint.event[order], np.bool_),
        stratum=read_only(stratum[order], np.int64),
        stratum_labels=labels,
        time_unit=time_unit(endpoint),
        start_day=None if start is None else read_only(start[order], np.int64),
        end_day=None if end is None else read_only(end[order], np.int64),
    )


def changes(previous: Sample, current: Sample) -> Changes:
    """What differs between two snapshots, subject by subject, in the order of `current`."""
    before = {subject: row for row, subject in enumerate(previous.subject)}
    now = set(current.subject)
    old = np.array([before.get(subject, -1) for subject in current.subject], dtype=np.int64)
    common = old >= 0
    had = np.zeros(old.size, dtype=np.bool_)
    had[common] = previous.event[old[common]]
    gone = [subject not in now for subject in previous.subject]
    vanished = np.array(gone, dtype=np.bool_)
    return Changes(
        n_common=int(common.sum()),
        new_subjects=_named(current, ~common),
        vanished_subjects=_named(previous, vanished),
        new_events=_named(current, common & current.event & ~had),
        reversed_events=_named(current, common & ~current.event & had),
        moved_events=_named(current, common & current.event & had & _moved(previous, current, old)),
        changed_arm=_named(current, common & (previous.experimental[old] != current.experimental)),
        changed_stratum=_named(current, common & (_labels(previous)[old] != _labels(current))),
        new_subjects_with_event=_named(current, ~common & current.event),
        vanished_with_event=_named(previous, vanished & previous.event),
    )


def _named(sample: Sample, at: Bools) -> tuple[str, ...]:
    return tuple(sample.subject[row] for row in np.flatnonzero(at))


def _moved(previous: Sample, current: Sample, old: Ints) -> Bools:
    """Another time, or another date of the event where both snapshots have dates."""
    moved: Bools = previous.time[old] != current.time
    if previous.end_day is not None and current.end_day is not None:
        moved |= previous.end_day[old] != current.end_day
    return moved


def _labels(sample: Sample) -> np.ndarray[tuple[int], np.dtype[np.object_]]:
    """The stratum of each row by its label: indices may mean other strata in another snapshot."""
    return np.array(sample.stratum_labels, dtype=np.object_)[sample.stratum]
