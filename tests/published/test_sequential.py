"""Spending, families, design, outlook and inference against the values of app/validation."""

from __future__ import annotations

import dataclasses

import pytest

from app.validation.design_rows import design_rows
from app.validation.family_rows import family_rows
from app.validation.outlook_rows import outlook_rows
from app.validation.rows import PublishedRow
from app.validation.sequential_rows import sequential_rows

ROWS = (*sequential_rows(), *family_rows(), *design_rows(), *outlook_rows())


def label(row: PublishedRow) -> str:
    return f"{row.quantity} [{row.mark}]"


@pytest.mark.parametrize("row", ROWS, ids=label)
def test_the_value_agrees_to_its_printed_digits(row: PublishedRow) -> None:
    outcome = row.check()
    assert outcome.agrees, f"expected {row.expected}, computed {outcome.computed!r} ({row.publication})"


@pytest.mark.parametrize("row", [row for row in ROWS if row.note], ids=label)
def test_a_row_with_a_note_really_differs_from_its_printed_digits(row: PublishedRow) -> None:
    assert not dataclasses.replace(row, units=0.5).check().agrees


def test_every_row_has_a_name_of_its_own() -> None:
    assert len({(row.quantity, row.publication) for row in ROWS}) == len(ROWS)
