"""Looks held before this file: what was used beside what is computed here, and where it is from."""

from __future__ import annotations

from app.model.boundary import HeldCompared
from app.model.values import Absent
from app.sheets.blocks import Cell, Column, Line, Row, Span, Table
from app.sheets.words import DASH, Z, alpha, alpha_difference, count, line, listed, number, z_number, z_places
from app.views.closed import ClosedView

HELD_BEFORE = "held before this file"


def held_tables(view: ClosedView, side: str) -> tuple[Table, ...]:
    """Bounds and alpha (of which `side`) as used and as computed; nothing where no look was held before."""
    if not view.look.held:
        return ()
    of_test: tuple[Line, ...] = () if view.masked else (line(Z),)
    of_bounds = ("bound used", "computed", "difference", "alpha used", "computed", "difference")
    heads = (line("events"), *of_test, *map(line, of_bounds))
    return (
        Table(
            line(f"Looks {HELD_BEFORE}"),
            (*map(Column, heads), Column(line("source"), "words")),
            tuple(_held_row(held, masked=view.masked) for held in view.look.held),
            note=line(f"What was used stands; beside it what is computed here from the plan. Alpha {side}."),
        ),
    )


def _held_row(held: HeldCompared, *, masked: bool) -> Row:
    spans = (count(held.events), *(() if masked else (_z(held),)), *_bounds(held), *_alphas(held))
    return Row(line(f"Look {held.number}"), (*(Cell((span,)) for span in spans), Cell(line(held.source))))


def _z(held: HeldCompared) -> Span:
    return DASH if held.z is None else z_number(held.z, places=z_places(held.z, _used(held)))


def _used(held: HeldCompared) -> float | Absent:
    return Absent("no bound is recorded") if held.efficacy_z is None else held.efficacy_z


def _bounds(held: HeldCompared) -> tuple[Span, Span, Span]:
    """The bound used, the bound computed, and the first less the second; a dash for what there is not."""
    used, computed = _used(held), held.computed_efficacy_z
    places = z_places(used, computed)
    shown = [DASH if isinstance(bound, Absent) else number(bound, places) for bound in (used, computed)]
    if isinstance(used, Absent) or isinstance(computed, Absent):
        return shown[0], shown[1], DASH
    return shown[0], shown[1], number(used - computed, places)


def _alphas(held: HeldCompared) -> tuple[Span, Span, Span]:
    used, computed = held.alpha_spent, held.computed_alpha_spent
    return alpha(used), alpha(computed), alpha_difference(used - computed)


def held_words(view: ClosedView) -> str:
    """Whose numbers those of looks held before are; masked, why no z of theirs is shown."""
    before = [str(held.number) for held in view.look.held]
    if not before:
        return ""
    looks = f" Look{'s' if len(before) > 1 else ''} {listed(before)}: {HELD_BEFORE}"
    whose = "their" if len(before) > 1 else "its"
    return f"{looks}{f'; {whose} z, known by arm, is not shown masked' if view.masked else ''}."
