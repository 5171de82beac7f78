"""What stands beside the plan's own endpoint on sheet 4: further hypotheses, and harm on its own endpoint."""

from __future__ import annotations

from app.model.plan import Hypothesis
from app.model.values import Absent
from app.sequential.gatekeeping import PRIMARY, family_alpha
from app.sheets.arms import label_of
from app.sheets.blocks import Cell, Column, Line, Row, Span, Table
from app.sheets.words import (
    CROSSED,
    DASH,
    NO_BREAK,
    P,
    Z,
    alpha,
    count,
    interval,
    level_text,
    line,
    number,
    of_total,
    or_dash,
    p_values,
    z_places,
)
from app.views.closed import ClosedView, HypothesisView, Reading


def is_harm_elsewhere(view: ClosedView) -> bool:
    """Whether harm is judged by another z than that of the plan's endpoint."""
    return view.harm is not None


def harm_endpoint_name(view: ClosedView) -> str:
    """The name of the hypothesis on harm's endpoint, else the endpoint's code as the extract has it."""
    endpoint = view.plan.harm_endpoint or view.plan.endpoint
    names = {each.parameter: each.name for each in view.plan.hypotheses}
    return names.get(endpoint.parameter, endpoint.parameter)


# --- further hypotheses ---------------------------------------------------------------------------------


def hypotheses_table(view: ClosedView) -> tuple[Table, ...]:
    """Where each further hypothesis stands; nothing where the plan has none."""
    if not view.hypotheses:
        return ()
    rows = [row for each in view.hypotheses for row in (_masked_rows if view.masked else _rows)(each)]
    if view.masked:
        columns = tuple(Column(line(f"if {each.experimental} is experimental")) for each in view.readings)
    else:
        columns = (Column(line("observed")), Column(line("efficacy bound")))
    return (Table(line("Further hypotheses"), columns, tuple(rows)),)


def _rows(each: HypothesisView) -> tuple[Row, ...]:
    (reading,) = each.view.readings
    bound = each.view.look.bound.efficacy_z
    places = z_places(reading.z, bound)
    cells = Cell((number(reading.z, places),)), Cell((or_dash(bound, places),))
    stands = line(_counted(each), ": ", _state(each, reading))
    return (
        Row(line(each.hypothesis.name, ", ", Z), cells),
        Row(stands, (Cell(()), Cell(())), indent=True),
    )


def _masked_rows(each: HypothesisView) -> tuple[Row, ...]:
    bound = each.view.look.bound.efficacy_z
    readings = each.view.readings
    places = [z_places(reading.z, bound) for reading in readings]
    z = (Cell((number(reading.z, at),)) for reading, at in zip(readings, places, strict=True))
    bounds = (Cell((or_dash(bound, at),)) for at in places)
    return (
        Row(line(each.hypothesis.name, ", ", Z), tuple(z)),
        Row(line("Efficacy bound"), tuple(bounds), indent=True),
        Row(_counted(each), tuple(Cell(_state(each, reading)) for reading in readings), indent=True),
    )


def _counted(each: HypothesisView) -> Line:
    information = each.view.look.information
    return line(of_total(information.events, information.planned_events), f"{NO_BREAK}events")


def _state(each: HypothesisView, reading: Reading) -> Line:
    """ "waits for the plan's endpoint", "crossed", "crossed at look 3", "not crossed"."""
    first, number_ = reading.verdict.first_crossed, each.view.look.number
    if reading.waits_for is not None:
        return line(f"waits for {named(reading.waits_for)}")
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
    """ " Death: z 1.703 against 3.065, waits for the plan's endpoint." for each that the plan has."""
    return line(*(_said(each) for each in view.hypotheses))


def _said(each: HypothesisView) -> Line:
    """Masked, where each reading stands; the z of both readings are in the table."""
    states = [_state(each, reading) for reading in each.view.readings]
    if len(states) == 2:
        said = states[0] if states[0] == states[1] else _by_reading(each, states)
        return line(f" {each.hypothesis.name}: ", said, ".")
    (reading,) = each.view.readings
    bound = each.view.look.bound.efficacy_z
    places = z_places(reading.z, bound)
    z = line(Z, NO_BREAK, number(reading.z, places))
    beside = line(" against ", number(bound, places)) if not isinstance(bound, Absent) else line()
    return line(f" {each.hypothesis.name}: ", z, beside, ", ", states[0], ".")


def _by_reading(each: HypothesisView, states: list[Line]) -> Line:
    first, second = each.view.readings
    return line(
        states[0], f" if {first.experimental} is experimental, ", states[1], f" if {second.experimental} is"
    )


def hypotheses_note(view: ClosedView) -> Line:
    """What the hypotheses share, and how they were planned."""
    if not view.hypotheses:
        return ()
    design = view.plan.design
    sides = "one-sided" if design.sides == 1 else "two-sided"
    level = family_alpha(design.alpha, view.plan.hypotheses)
    planned = (_planned(each.hypothesis) for each in view.hypotheses)
    return line(
        f" All hypotheses together: {sides} ", alpha(level), ". ", *planned, "Each spends by its own events."
    )


def _planned(hypothesis: Hypothesis) -> Line:
    waits = "" if hypothesis.after is None else f", after {named(hypothesis.after)}"
    return line(f"{hypothesis.name}: alpha ", alpha(hypothesis.alpha), f"{waits}. ")


def hypothesis_details(view: ClosedView) -> tuple[Table, ...]:
    """A table of each further hypothesis with its counts, test, ratio and bound; folded."""
    return tuple(_details(each) for each in view.hypotheses)


def _details(each: HypothesisView) -> Table:
    view = each.view
    return Table(
        caption=line(f"{each.hypothesis.label}, {_against(view)}"),
        columns=tuple(Column(line(head)) for head in ("observed", "at the efficacy bound")),
        rows=(
            *(_arm_row(view, index) for index in range(2)),
            *_test_rows(view),
            Row(line("Hazard ratio"), (Cell(*_ratio(view)), Cell((_bound_ratio(view),)))),
            Row(line("Alpha spent"), (Cell((alpha(view.look.bound.alpha_spent),)), Cell(()))),
        ),
    )


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


def _ratio(view: ClosedView) -> tuple[Line, Line]:
    """The estimate, and under it its interval."""
    cox = view.cox
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
    test, cox = harm.logrank, harm.cox
    ratio = cox if isinstance(cox, Absent) else cox.hazard_ratio
    counted = (
        Row(
            line(f"Events, {label_of(view, arm).in_sentence}"),
            (Cell(line(of_total(counts.events, counts.subjects))),),
        )
        for arm, counts in zip(view.arms, harm.counts, strict=True)
    )
    return (
        Table(
            caption=line(f"Harm, judged on {harm_endpoint_name(view)}"),
            columns=(Column(()),),
            rows=(
                *counted,
                Row(line(Z), (Cell(line(number(test if isinstance(test, Absent) else test.z, 3))),)),
                Row(line("Harm bound"), (Cell(line(or_dash(_harm_bound(view), 3))),)),
                Row(line("Hazard ratio"), (Cell(line(number(ratio, 3))),)),
            ),
        ),
    )


def _harm_bound(view: ClosedView) -> float | Absent:
    bound = view.look.bound.harm_z
    return Absent("the plan has no harm boundary") if bound is None else bound


def harm_note(view: ClosedView) -> Line:
    if view.harm is None:
        return ()
    events = sum(counts.events for counts in view.harm.counts)
    return line(
        f" Harm is judged on {harm_endpoint_name(view)} (", count(events), " events so far); "
        "bounds ahead suppose that its events grow as those of the test do.",
    )  # fmt: skip
