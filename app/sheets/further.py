"""What stands beside the plan's own endpoint on sheet 4: further hypotheses, and harm on its own endpoint."""

from __future__ import annotations

from collections.abc import Sequence

from app.model.survival import CoxResult
from app.model.values import Absent, Estimate
from app.sequential.gatekeeping import PRIMARY, family_alpha
from app.sheets.arms import label_of
from app.sheets.blocks import Cell, Column, LaneRow, Line, Row, Span, Table
from app.sheets.words import (
    CROSSED,
    DASH,
    NO_BREAK,
    P,
    Z,
    alpha,
    interval,
    level_text,
    line,
    number,
    of_total,
    or_dash,
    p_values,
    z_places,
)
from app.views.closed import ClosedView, HypothesisView
from app.views.reading import Reading

LONGEST_NAME = 20


def is_harm_elsewhere(view: ClosedView) -> bool:
    """Whether harm is judged by another z than that of the plan's endpoint."""
    return view.harm is not None


def harm_endpoint_name(view: ClosedView) -> str:
    """The name of the hypothesis on harm's endpoint, else the endpoint's code as the extract has it."""
    endpoint = view.plan.harm_endpoint or view.plan.endpoint
    names = {each.parameter: each.name for each in view.plan.hypotheses}
    return names.get(endpoint.parameter, endpoint.parameter)


def harm_row_name(view: ClosedView) -> str:
    """The same where it must fit beside the lanes."""
    return fitting_name(harm_endpoint_name(view), (view.plan.harm_endpoint or view.plan.endpoint).parameter)


# --- further hypotheses ---------------------------------------------------------------------------------


def hypothesis_rows(view: ClosedView) -> tuple[Row, ...]:
    """A row of each further hypothesis for the table of where the test stands."""
    return tuple((_masked_row if view.masked else _row)(each) for each in view.hypotheses)


def _row(each: HypothesisView) -> Row:
    (reading,) = each.view.readings
    bound = each.view.look.bound.efficacy_z
    places = z_places(reading.z, bound)
    cells = Cell((number(reading.z, places),)), Cell((or_dash(bound, places),))
    return Row(line(Z, f" of {each.hypothesis.name}, ", _state(each, reading)), cells)


def _masked_row(each: HypothesisView) -> Row:
    states = tuple(Cell(_state(each, reading)) for reading in each.view.readings)
    return Row(line(each.hypothesis.name), states)


def rows_under_lanes(view: ClosedView, looks: Sequence[int | None]) -> tuple[LaneRow, ...]:
    """z of each further hypothesis and the bound that it is for; `looks` are lanes, None one to come."""
    return tuple(row for each in view.hypotheses for row in _lane_rows(each, looks))


def _lane_rows(each: HypothesisView, looks: Sequence[int | None]) -> tuple[LaneRow, LaneRow]:
    view, reading = each.view, each.view.readings[0]
    used = {held.number: (held.z, held.efficacy_z) for held in reading.history}
    z = None if isinstance(reading.z, Absent) else reading.z
    used[view.look.number] = (z, view.look.bound.efficacy_z)
    shown = [used.get(look) if look is not None else None for look in looks]
    plus_minus = ", ±" if view.masked or view.plan.design.sides == 2 else ""
    return (
        LaneRow(
            line(Z, f" of {_fitting(each)}"),
            line(Z, f" {each.hypothesis.parameter}"),
            tuple(map(_z_cell, shown)),
        ),
        LaneRow(
            line(f"bound of {_fitting(each)}{plus_minus}"),
            line("its bound"),
            tuple(map(_bound_cell, shown)),
            indent=True,
        ),
    )


def _fitting(each: HypothesisView) -> str:
    return fitting_name(each.hypothesis.name, each.hypothesis.parameter)


def fitting_name(name: str, parameter: str) -> str:
    """The name, or where that is too long for the column beside the lanes the endpoint's code."""
    return name if len(name) <= LONGEST_NAME else parameter


_Used = tuple[float | None, Estimate]


def _z_cell(used: _Used | None) -> Span | None:
    if used is None:
        return None
    z, bound = used
    return None if z is None else number(z, z_places(z, bound))


def _bound_cell(used: _Used | None) -> Span | None:
    if used is None:
        return None
    z, bound = used
    return or_dash(bound, 3 if z is None else z_places(z, bound))


def _counted(each: HypothesisView) -> Line:
    information = each.view.look.information
    return line(of_total(information.events, information.planned_events))


def _state(each: HypothesisView, reading: Reading) -> Line:
    """ "waits", "crossed", "crossed at look 3", "not crossed"."""
    first, number_ = reading.verdict.first_crossed, each.view.look.number
    if reading.waits_for is not None:
        return line("waits")
    if first is not None and first < number_:
        return line(CROSSED, f" at look{NO_BREAK}{first}")
    if reading.verdict.crossed == "control":
        return line(CROSSED, ", other side")
    if reading.verdict.crossed == "efficacy":
        return line(CROSSED)
    return line("no bound" if isinstance(each.view.look.bound.efficacy_z, Absent) else "not crossed")


def named(hypothesis: str) -> str:
    return "the plan’s endpoint" if hypothesis == PRIMARY else hypothesis


def hypotheses_sentence(view: ClosedView) -> Line:
    """ " Death waits for the plan's endpoint." for each further hypothesis; empty where there is none."""
    return line(*(_said(each) for each in view.hypotheses))


def _said(each: HypothesisView) -> Line:
    name, readings = each.hypothesis.name, each.view.readings
    states = [_state(each, reading) for reading in readings]
    waits = {reading.waits_for for reading in readings}
    if None not in waits:
        return line(f" {name} waits for {named(readings[0].waits_for or PRIMARY)}.")
    if len(readings) == 1:
        return line(f" {name}: ", _z_beside_bound(each, readings[0]), ", ", states[0], ".")
    if states[0] == states[1]:
        return line(f" {name}: ", states[0], " in both readings.")
    one, other = (reading.experimental for reading in readings)
    return line(f" {name}: ", states[0], f" if {one} is experimental, ", states[1], f" if {other} is.")


def _z_beside_bound(each: HypothesisView, reading: Reading) -> Line:
    bound = each.view.look.bound.efficacy_z
    places = z_places(reading.z, bound)
    z = line(Z, NO_BREAK, number(reading.z, places))
    return z if isinstance(bound, Absent) else line(z, " against ", number(bound, places))


def waiting_note(view: ClosedView) -> Line:
    """Which hypotheses still wait, and for what."""
    return line(*(_said(each) for each in view.hypotheses if each.view.readings[0].waits_for is not None))


def hypothesis_details(view: ClosedView) -> tuple[Table, ...]:
    """A table of each further hypothesis with its counts, test, ratio and bound; folded."""
    sides = "one-sided" if view.plan.design.sides == 1 else "two-sided"
    level = family_alpha(view.plan.design.alpha, view.plan.hypotheses)
    shared = line(f" All hypotheses together are tested at {sides} ", alpha(level), ".")
    return tuple(_details(each, shared) for each in view.hypotheses)


def _details(each: HypothesisView, shared: Line) -> Table:
    view = each.view
    after = "at once" if each.hypothesis.after is None else f"after {named(each.hypothesis.after)}"
    return Table(
        caption=line(each.hypothesis.name, f", {_against(view)}"),
        note=line(f"{each.hypothesis.label}, tested {after}.", shared),
        columns=tuple(Column(line(head)) for head in ("observed", "at the efficacy bound")),
        rows=(
            *(_arm_row(view, index) for index in range(2)),
            Row(line("Events of planned"), (Cell(_counted(each)), Cell(()))),
            *_test_rows(view),
            Row(line("Hazard ratio"), (Cell(*_ratio(view.cox)), Cell((_bound_ratio(view),)))),
            Row(
                line("Alpha of one side, spent so far and in all"),
                (_alpha_cell(view.look.bound.alpha_spent), _alpha_cell(view.plan.design.alpha_one_side)),
            ),
        ),
    )


def _alpha_cell(value: float) -> Cell:
    return Cell((alpha(value),))


def _against(view: ClosedView) -> str:
    of, other = (label_of(view, arm).in_sentence for arm in view.arms)
    return f"{of} against {other}"


def _arm_row(view: ClosedView, index: int) -> Row:
    arm = view.arms[index]
    events = line(of_total(arm.counts.events, arm.counts.subjects))
    return Row(line(f"Events, {label_of(view, arm).in_sentence}"), (Cell(events), Cell(())))


def _test_rows(view: ClosedView) -> tuple[Row, ...]:
    """z of the arm that the orientation is of, and its p: one-sided where the direction is known."""
    bound, (reading, *_) = view.look.bound, view.readings
    places = z_places(reading.z, bound.efficacy_z)
    z = Row(line(Z), (Cell((number(reading.z, places),)), Cell((or_dash(bound.efficacy_z, places),))))
    if view.masked:
        two = view.logrank if isinstance(view.logrank, Absent) else view.logrank.p_two_sided
        return z, Row(line(P, ", two-sided"), (Cell(p_values(two)), Cell(())))
    observed, at_bound = p_values(reading.p_one_sided, bound.efficacy_p_one_sided)
    beside = DASH if isinstance(bound.efficacy_p_one_sided, Absent) else at_bound
    return z, Row(line(P, ", one-sided"), (Cell((observed,)), Cell((beside,))))


def _ratio(cox: CoxResult | Absent) -> tuple[Line, Line]:
    """The estimate, and under it its interval."""
    if isinstance(cox, Absent):
        return line(number(cox, 3)), ()
    limits = line(f"{level_text(cox.level)}: ", interval(cox.ci_low, cox.ci_high, 3))
    return line(number(cox.hazard_ratio, 3)), limits


def _bound_ratio(view: ClosedView) -> Span:
    return DASH if view.masked else or_dash(view.look.bound.efficacy_hazard_ratio, 3)


# --- harm on an endpoint of its own ---------------------------------------------------------------------


def harm_table(view: ClosedView) -> tuple[Table, ...]:
    """Who was counted on harm's own endpoint, and its z; nothing where harm stands on the plan's."""
    harm = view.harm
    if harm is None:
        return ()
    test = harm.logrank
    counted = (
        Row(
            line(f"Events, {label_of(view, arm).in_sentence}"),
            (Cell(line(of_total(counts.events, counts.subjects))),),
        )
        for arm, counts in zip(view.arms, harm.counts, strict=True)
    )
    return (
        Table(
            caption=line(f"Harm, judged on {harm_endpoint_name(view)}", f", {_against(view)}"),
            columns=(Column(()),),
            rows=(
                *counted,
                Row(line(Z), (Cell(line(number(test if isinstance(test, Absent) else test.z, 3))),)),
                Row(
                    line("Harm bound, each reading" if view.masked else "Harm bound"),
                    (Cell(line(or_dash(_harm_bound(view), 3))),),
                ),
                Row(line("Hazard ratio"), (Cell(*_ratio(harm.cox)),)),
            ),
        ),
    )


def _harm_bound(view: ClosedView) -> float | Absent:
    bound = view.look.bound.harm_z
    return Absent("the plan has no harm boundary") if bound is None else bound
