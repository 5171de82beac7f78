"""The figure of the Boundary sheet: its lanes, the numbers under them, and the same as a table."""

from __future__ import annotations

from dataclasses import dataclass, replace

from app.model.boundary import Bound
from app.model.values import Estimate
from app.sheets.arms import labels
from app.sheets.blocks import BoundaryFigure, Cell, Column, Lane, LaneRow, Row, Span, Table
from app.sheets.boundary_lanes import bound_places, boundary_lanes, z_now, z_shown
from app.sheets.curves import against
from app.sheets.further import harm_row_name, is_harm_elsewhere, rows_under_lanes
from app.sheets.words import DASH, Z, alpha, count, line, number, or_dash, z_number
from app.views.closed import ClosedView


def boundary_figure(view: ClosedView) -> BoundaryFigure:
    of, other = labels(view)
    two_lanes = view.masked and view.plan.design.sides == 1
    return BoundaryFigure(
        title="z against its boundary, by information",
        description="Each look is a gauge at its information fraction: z as a mark, the efficacy bound as "
        "a bar, the region beyond the bound in grey. The same numbers stand in the table.",
        y_title=line(Z, f", {against(view)}"),
        favours_up=f"favours {of.in_sentence}",
        favours_down=f"favours {other.in_sentence}",
        lanes=boundary_lanes(view),
        rows=_lane_rows(view),
        layout="two lanes" if two_lanes else "one lane",
    )


@dataclass(frozen=True)
class _Column:
    """The numbers under one lane, of a look held, shown or to come."""

    fraction: float
    events: int
    z: float | None
    bound: Estimate
    ratio: Estimate
    spent: float
    futility: Estimate | None = None
    harm: Estimate | None = None
    z_for_harm: float | None = None


def _columns(view: ClosedView) -> tuple[_Column, ...]:
    held = (
        _Column(
            each.fraction,
            each.events,
            each.z,
            each.efficacy_z,
            each.efficacy_hazard_ratio,
            each.alpha_spent,
            each.futility_z,
            each.harm_z,
            each.z_for_harm,
        )
        for each in view.readings[0].history
    )
    ahead = () if view.is_over else view.look.planned
    now = _of_bound(view.look.bound, z_now(view), view.readings[0].z_for_harm)
    return (*held, now, *(_of_bound(bound, None) for bound in ahead))


def _of_bound(bound: Bound, z: float | None, z_for_harm: float | None = None) -> _Column:
    return _Column(
        bound.information_fraction,
        bound.events,
        z,
        bound.efficacy_z,
        bound.efficacy_hazard_ratio,
        bound.alpha_spent,
        bound.futility_z,
        bound.harm_z,
        z_for_harm,
    )


def _lane_rows(view: ClosedView) -> tuple[LaneRow, ...]:
    """The numbers under the lanes, in the order the question asks them: how far, where, against what."""
    columns = _columns(view)
    plus_minus = ", ±" if view.masked or view.plan.design.sides == 2 else ""
    fractions = tuple(number(each.fraction, 3) for each in columns)
    bounds = tuple(or_dash(each.bound, bound_places(each.z, each.bound)) for each in columns)
    spent = tuple(alpha(each.spent) for each in columns)
    return (
        LaneRow(line("Information fraction"), line("Fraction"), fractions),
        LaneRow(line("Events"), line("Events"), tuple(count(each.events) for each in columns)),
        LaneRow(line(Z), line(Z), tuple(z_shown(each.z, each.bound) for each in columns), rule_above=True),
        LaneRow(line(f"Efficacy bound{plus_minus}"), line("Efficacy"), bounds),
        *(() if view.masked else (_ratio_row(columns),)),
        *_rows_below(view, columns),
        *rows_under_lanes(view, _looks_held_or_shown(view)),
        LaneRow(line(f"Alpha spent, {side_words(view)}"), line("Alpha"), spent),
    )


def _ratio_row(columns: tuple[_Column, ...]) -> LaneRow:
    """The efficacy bound on the scale of the hazard ratio, which has a direction."""
    ratios = tuple(or_dash(each.ratio, 3) for each in columns)
    return LaneRow(line("as a hazard ratio"), line("as HR"), ratios, indent=True)


def _looks_held_or_shown(view: ClosedView) -> list[int | None]:
    """The look of each lane, None for one to come."""
    return [None if lane.state == "planned" else lane.look for lane in boundary_lanes(view)]


def _rows_below(view: ClosedView, columns: tuple[_Column, ...]) -> tuple[LaneRow, ...]:
    """Futility and harm, where the plan has them; masked they are read in each reading's own direction."""
    each = ", each reading" if view.masked else ""
    kinds = (
        ("Futility", view.plan.futility, [column.futility for column in columns]),
        ("Harm", view.plan.harm, [column.harm for column in columns]),
    )
    rows = tuple(
        LaneRow(
            line(f"{name} bound{each}"),
            line(name),
            tuple(DASH if z is None else or_dash(z, 3) for z in bounds),
        )
        for name, table, bounds in kinds
        if table is not None
    )
    if not is_harm_elsewhere(view):
        return rows
    *others, bound = rows
    of_it = replace(bound, head=line(f"Harm bound on {harm_row_name(view)}{each}"))
    is_shown = view.plan.harm_endpoint_is_a_hypothesis
    return (*others, of_it) if is_shown else (*others, _harm_z_row(view, columns), of_it)


def _harm_z_row(view: ClosedView, columns: tuple[_Column, ...]) -> LaneRow:
    """z of harm's own endpoint, over the bound that it is for."""
    of_harm = tuple(None if each.z_for_harm is None else z_number(each.z_for_harm) for each in columns)
    return LaneRow(line(Z, f" of {harm_row_name(view)}"), line("Harm ", Z), of_harm)


def side_words(view: ClosedView) -> str:
    return "one-sided" if view.plan.design.sides == 1 else "each side"


def looks_table(view: ClosedView) -> Table:
    """The figure in numbers: a row a look."""
    figure_rows = _lane_rows(view)
    lanes = boundary_lanes(view)
    columns = tuple(Column(row.head) for row in figure_rows)
    rows = tuple(
        Row(
            line(f"{lane.look}, {_state_word(lane, view)}"),
            tuple(_cell(row.cells[index]) for row in figure_rows),
        )
        for index, lane in enumerate(lanes)
    )
    return Table(line(f"The looks and their bounds, {against(view)}"), columns, rows, line("Look"))


def _cell(span: Span | None) -> Cell:
    return Cell(() if span is None else (span,))


def _state_word(lane: Lane, view: ClosedView) -> str:
    if lane.state == "planned":
        return "planned, final" if lane.final else "planned"
    if lane.state == "past":
        return "held before" if lane.look in view.look.held_before else "held"
    return f"{view.look.kind}, shown" if not lane.final or view.look.kind == "final" else "final, shown"
