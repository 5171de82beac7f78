"""A hazard ratio of the reader's own: its row in every reading, and what keeps it out of what is frozen."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, fields, is_dataclass
from typing import Any, get_args, get_type_hints

import pytest

from app.ledger import bodies
from app.ledger.history import State
from app.model.look import LookResult
from app.model.outlook import WhatIf
from app.model.values import Absent
from app.sheets.blocks import LookBook
from app.sheets.outlook import outlook_sheet
from app.sheets.record import History
from app.sheets.what_if import WhatIfForm, what_if_form, what_if_row
from app.verification.assembly import Assembled
from app.views.closed import ClosedView, Letters, masked_view, unmasked_view
from app.views.what_if import what_if
from tests.unit.review.invented_trial import plan
from tests.unit.sheets.invented_looks import A_IS_CONTROL, A_IS_EXPERIMENTAL, held, life, text


def view(*zs: float, letters: Letters | None = None) -> ClosedView:
    look = life(*zs)[-1]
    if letters is None:
        return unmasked_view(look, plan(), A_IS_CONTROL)
    return masked_view(look, plan(), letters)


def cells(of: ClosedView, hazard_ratio: float) -> list[str]:
    return [text(cell.line) for cell in what_if_row(what_if(of, hazard_ratio)).cells]


def design_row(of: ClosedView) -> list[str]:
    return [text(cell.line) for cell in outlook_sheet(of).wide_tables[0].rows[0].cells]


@pytest.mark.parametrize("letters", [None, A_IS_CONTROL, A_IS_EXPERIMENTAL])
def test_the_plan_s_own_ratio_gives_the_row_of_the_plan(letters: Letters | None) -> None:
    ratio, asked_about = plan().design.hazard_ratio, 0
    for look in held():
        of = look.view(letters)
        for asked, reading in zip(what_if(of, ratio).readings, of.readings, strict=True):
            outlook = reading.onwards.outlook
            assert asked == (outlook if isinstance(outlook, Absent) else outlook.design)
            asked_about += not isinstance(outlook, Absent)
        if not isinstance(of.readings[0].onwards.outlook, Absent):
            assert cells(of, ratio)[: len(design_row(of))] == design_row(of)
    assert asked_about >= 2


def test_masked_the_ratio_is_experimental_to_control_in_both_readings() -> None:
    first, second = masked = (
        cells(view(0.4, letters=A_IS_CONTROL), 0.8)[:3],
        cells(view(0.4, letters=A_IS_CONTROL), 0.8)[3:],
    )
    assert [reading[0] for reading in masked] == ["0.800", "0.800"]
    assert first != second


def test_masked_nothing_tells_which_letter_is_which() -> None:
    """A trial and the same one with the arms exchanged and the letters with them read alike."""
    assert cells(view(0.4, letters=A_IS_CONTROL), 0.8) == cells(view(-0.4, letters=A_IS_EXPERIMENTAL), 0.8)
    hints = {what_if_form(view(0.4, letters=letters)).hint for letters in (A_IS_CONTROL, A_IS_EXPERIMENTAL)}
    assert hints == {"in each reading experimental / control, from 0.05 to 20; never kept"}


def test_a_reading_that_has_crossed_is_not_asked() -> None:
    of = view(0.0, 2.6, letters=A_IS_CONTROL)  # crossed if B is experimental
    assert len(cells(of, 0.8)) == 3
    assert len(design_row(of)) == 3


def test_the_row_says_that_it_is_no_part_of_the_look() -> None:
    row = what_if_row(what_if(view(0.4), 0.8))
    assert text(row.head) == "What if, not frozen"
    assert row.apart


# --- kept out of everything that is frozen --------------------------------------------------------------


def types_within(kind: Any, known: set[Any]) -> Iterator[Any]:
    """Every type that a value of this type can hold, however deep, as the annotations have it."""
    if kind in known:
        return
    known.add(kind)
    yield kind
    parts = list(get_args(kind))
    if is_dataclass(kind):
        hints = get_type_hints(kind)
        parts += [hints[field.name] for field in fields(kind)]
    for part in parts:
        yield from types_within(part, known)


ENTRIES = [kind for kind in vars(bodies).values() if is_dataclass(kind) and fields(kind)]
FROZEN_FROM = [LookResult, ClosedView, Assembled, LookBook, State, History, *ENTRIES]
"""What a freeze, its report, an entry and a verification are made of."""


@pytest.mark.parametrize("kind", FROZEN_FROM, ids=lambda kind: kind.__name__)
def test_nothing_that_is_frozen_has_a_place_for_a_what_if(kind: Any) -> None:
    held = set(types_within(kind, set()))
    assert len(held) > 1
    assert not held & {WhatIf, WhatIfForm}


@dataclass(frozen=True)
class Planted:
    """A look that would carry what somebody asked."""

    looks: tuple[tuple[str, WhatIf | None], ...]


def test_a_place_for_one_would_be_found() -> None:
    assert WhatIf in set(types_within(Planted, set()))
    assert len(ENTRIES) > 5
