"""Every number that a page shows stands in the record at full precision."""

from __future__ import annotations

import re
from collections.abc import Iterator
from typing import Any

import pytest

from app.sheets.blocks import CurvesFigure, IntervalMark, Lane, LookBook, Sheet, Span
from app.views.record import looks_record
from tests.unit.review.invented_trial import held_before, plan
from tests.unit.sheets.invented_looks import A_IS_CONTROL, FURTHER, TWO_SIDED, Held, book, held, parts

BEFORE = held_before(1.5, -0.25)
Shown = list[tuple[LookBook, set[float], Held]]


@pytest.fixture(
    scope="module",
    params=[
        ((), False),
        ((), True),
        ((TWO_SIDED,), False),
        ((TWO_SIDED,), True),
        ((FURTHER,), False),
        ((FURTHER,), True),
        ((BEFORE,), False),
        ((BEFORE,), True),
    ],
    ids=[
        "unmasked",
        "masked",
        "two sides",
        "two sides, masked",
        "further endpoints",
        "further endpoints, masked",
        "held before",
        "held before, masked",
    ],
)
def shown(request: pytest.FixtureRequest) -> Shown:
    """Each look of the invented trial: its book, the numbers of its record, and the look."""
    changes, masked = request.param
    letters = A_IS_CONTROL if masked else None
    looks = held(plan(*changes))
    return [
        (
            book(looks[:number], letters),
            set(numbers(looks_record("look", [looks[number - 1].view(letters)], run_at=""))),
            looks[number - 1],
        )
        for number in range(1, len(looks) + 1)
    ]


def numbers(value: Any) -> Iterator[float]:
    if isinstance(value, dict):
        for item in value.values():
            yield from numbers(item)
    elif isinstance(value, list):
        for item in value:
            yield from numbers(item)
    elif isinstance(value, int | float) and not isinstance(value, bool):
        yield float(value)


def read_from_the_extract(look: Held) -> set[float]:
    """Counts of the files as they were read; they are of the snapshot, whose bytes the trial file keeps."""
    files = {float(count) for file in look.extract.files for count in (file.n_rows, len(file.columns_read))}
    endpoints = {float(count) for _, rows, events in look.extract.parameters for count in (rows, events)}
    return files | endpoints | {float(len(look.extract.doubts))}


BEFORE_ANY_EVENT = {1.0}  # a curve is at 100% until its first event, which no row of the record says


def without(book: LookBook, key: str) -> tuple[Sheet, ...]:
    return tuple(sheet for sheet in book.sheets if sheet.key != key)


def test_every_number_of_every_sheet_is_in_the_record(shown: Shown) -> None:
    for book_, in_record, look in shown:
        known = in_record | read_from_the_extract(look) | BEFORE_ANY_EVENT
        spans = [span for span in parts(without(book_, "record"), Span) if span.value is not None]
        assert [span for span in spans if span.value not in known] == []
        assert len(spans) > 150


def test_every_number_reads_as_the_value_behind_it(shown: Shown) -> None:
    """As it stands, mirrored, in percent, in months of 30.4375 days or in years of 365.25."""
    for book_, _, _ in shown:
        for span in parts(without(book_, "record"), Span):
            if span.value is not None:
                assert any(
                    abs(said - scale * span.value) <= 0.5000001 * unit
                    for said, unit in [as_read(span.text)]
                    for scale in (1, -1, 100, 1 / 30.4375, 1 / 365.25)
                ), span


def as_read(text: str) -> tuple[float, float]:
    """The number that a text begins with, and a unit of its last digit."""
    digits = re.match(r"[−±]?(\d+)(?:\.(\d*))?(?:e−(\d+))?", text.replace("\u00a0", ""))
    assert digits is not None, text
    whole, decimals, exponent = digits[1], digits[2] or "", int(digits[3] or 0)
    sign = -1 if text.startswith("−") else 1
    return sign * float(f"{whole}.{decimals}e-{exponent}"), 10.0 ** -(len(decimals) + exponent)


def test_the_data_sheet_alone_shows_counts_of_the_files(
    shown: Shown,
) -> None:
    for book_, in_record, _ in shown:
        sheets = (*without(book_, "data"),)
        spans = [
            s for sheet in sheets if sheet.key != "record" for s in parts(sheet, Span) if s.value is not None
        ]
        assert [span for span in spans if span.value not in in_record | BEFORE_ANY_EVENT] == []


def test_every_point_of_the_curves_is_in_the_record(shown: Shown) -> None:
    for book_, _, look in shown:
        (figure,) = parts(book_.sheet("curves"), CurvesFigure)
        arms = (look.view(A_IS_CONTROL) if book_.frame.disclosure == "masked" else look.view()).arms
        for line, arm in zip(figure.lines, arms, strict=True):
            survival = {100 * value for value in arm.curve.survival.tolist()} | {100.0}
            low = {100 * value for value in arm.curve.ci_low.tolist()} | {None}
            assert set(line.survival) <= survival
            assert set(line.ci_low) <= low
            assert line.time[0] == 0.0
            assert line.survival[0] == 100.0


def test_every_mark_of_the_small_figures_is_in_the_record(
    shown: Shown,
) -> None:
    for book_, in_record, _ in shown:
        in_percent = {100 * number for number in in_record | BEFORE_ANY_EVENT}
        marks = list(parts(book_, IntervalMark))
        assert len(marks) == 2
        for mark in marks:
            assert mark.estimate in in_percent
            assert {mark.low, mark.high} <= in_percent | {None}
        assert all(lane.fraction in in_record for lane in parts(book_, Lane))
