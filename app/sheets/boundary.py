"""Sheet 4, Boundary: where does the test stand?"""

from __future__ import annotations

from dataclasses import dataclass, replace

from app.model.boundary import Bound, Crossed, LookAsUsed
from app.model.survival import LogrankResult, LogrankStratum
from app.model.values import Absent, Estimate
from app.sheets.arms import label_of, labels
from app.sheets.blocks import (
    BoundaryFigure,
    Cell,
    Column,
    Lane,
    LaneRow,
    Line,
    Row,
    Sheet,
    Span,
    Table,
)
from app.sheets.curves import NOT_ADJUSTED, against, cox_level
from app.sheets.further import (
    harm_endpoint_name,
    harm_table,
    hypothesis_details,
    hypothesis_rows,
    is_harm_elsewhere,
    rows_under_lanes,
    waiting_note,
)
from app.sheets.held import HELD_BEFORE, held_tables, held_words
from app.sheets.methods import methods, spending_key
from app.sheets.words import (
    CROSSED,
    DASH,
    MINUS,
    NO_BREAK,
    P,
    Z,
    alpha,
    count,
    decimal,
    interval,
    level_text,
    line,
    listed,
    number,
    or_dash,
    p_values,
    z_number,
    z_places,
)
from app.views.closed import ClosedView
from app.views.reading import Reading

QUESTION = "Where does the test stand?"
FINAL_WORDS = (
    " A final look spends all alpha that is left; "
    "ending early because of comparative results does not release it."
)


def boundary_sheet(view: ClosedView) -> Sheet:
    return Sheet(
        key="boundary",
        number=4,
        name="Boundary",
        question=QUESTION,
        answer=boundary_answer(view),
        figure=boundary_figure(view),
        tables=_standing_tables(view),
        folded=(
            *held_tables(view, _side_words(view)),
            *hypothesis_details(view),
            *harm_table(view),
            *_folded_score(view),
            *_strata_table(view),
        ),
        notes=(_note(view),),
        methods=methods(
            "logrank",
            spending_key(view.plan.efficacy.spending),
            "boundary",
            *(key for key in ("futility", "harm") if getattr(view.plan, key) is not None),
            *(("hypotheses",) if view.hypotheses else ()),
            "bound-hazard-ratio",
            "repeated-interval",
            "cox",
            masked=view.masked,
        ),
        figure_table=_looks_table(view),
    )


# --- the sentence ---------------------------------------------------------------------------------------


def boundary_answer(view: ClosedView) -> tuple[Line, ...]:
    """One sentence; masked, one for each reading."""
    if isinstance(view.logrank, Absent):
        return (line(f"The test cannot be computed: {view.logrank.reason}."),)
    if not view.masked:
        return (_unmasked_sentence(view, view.readings[0]),)
    return tuple(_masked_sentence(view, reading) for reading in view.readings)


def is_over_running(view: ClosedView, reading: Reading) -> bool:
    """True when an earlier look crossed in this reading: this one is shown beside it, with no second test."""
    first = reading.verdict.first_crossed
    return first is not None and first < view.look.number


def _unmasked_sentence(view: ClosedView, reading: Reading) -> Line:
    bound = view.look.bound.efficacy_z
    z = _z_of(reading, bound)
    if is_over_running(view, reading):
        at = f" at look{NO_BREAK}{reading.verdict.first_crossed}. This look is over-running: "
        return line("The boundary was ", CROSSED, at, z, ", no second test.")
    if isinstance(bound, Absent) and reading.verdict.crossed == "harm":
        return line("The harm boundary was ", CROSSED, _below_against(view, reading))
    if isinstance(bound, Absent):
        return line("No efficacy boundary applies: ", z, f". {_reason(bound)}.")
    places = z_places(reading.z, bound)
    if reading.verdict.crossed == "efficacy":
        against_bound = line(": ", z, " against ", z_number(bound, places=places), ".")
        return line("The efficacy boundary was ", CROSSED, against_bound)
    if reading.verdict.crossed == "control":
        start = line("The boundary in favour of ", label_of(view, view.against).in_sentence, " was ", CROSSED)
        return line(start, ": ", z, " against ", _mirror(bound, places), ".")
    if reading.verdict.crossed in ("futility", "harm"):
        return line(f"The {reading.verdict.crossed} boundary was ", CROSSED, _below_against(view, reading))
    if view.plan.design.sides == 2:
        both = Span(f"±{decimal(bound, places)}", value=bound)
        return line("No boundary was crossed: ", z, " against ", both, ".")
    return line(
        "The efficacy boundary was not crossed: ", z, " against ", z_number(bound, places=places), "."
    )


def _below_against(view: ClosedView, reading: Reading) -> Line:
    """ ": z 0.420 against 0.958." and, for futility that does not bind, that it does not."""
    crossed = reading.verdict.crossed
    bound = view.look.bound.harm_z if crossed == "harm" else view.look.bound.futility_z
    binds = crossed == "futility" and view.plan.futility is not None and view.plan.futility.binding
    advice = "." if binds or crossed == "harm" else "; it does not bind."
    if crossed == "harm" and is_harm_elsewhere(view):
        return line(f" on {harm_endpoint_name(view)}: ", _harm_against(reading, bound), ".")
    if bound is None or isinstance(bound, Absent):
        return line(".")
    return line(
        ": ", _z_of(reading, bound), " against ", z_number(bound, places=z_places(reading.z, bound)), advice
    )


def _masked_sentence(view: ClosedView, reading: Reading) -> Line:
    bound = view.look.bound.efficacy_z
    start = line(f"If {reading.experimental} is experimental: ", _z_of(reading, bound))
    if is_over_running(view, reading):
        at = f" at look{NO_BREAK}{reading.verdict.first_crossed}; no second test."
        return line(start, ", the boundary was ", CROSSED, at)
    if reading.verdict.crossed in ("futility", "harm"):
        return line(start, *_masked_below(view, reading))
    if isinstance(bound, Absent):
        return line(start, ", no efficacy boundary applies.")
    places = z_places(reading.z, bound)
    if reading.verdict.crossed == "efficacy":
        return line(start, ", efficacy bound ", z_number(bound, places=places), NO_BREAK, CROSSED, ".")
    if reading.verdict.crossed == "control":
        other = "B" if reading.experimental == "A" else "A"
        return line(start, ", bound ", _mirror(bound, places), f" in favour of {other} ", CROSSED, ".")
    return line(start, ", no boundary crossed.")


def _masked_below(view: ClosedView, reading: Reading) -> Line:
    """ ", futility bound 0.958 crossed." """
    crossed = reading.verdict.crossed
    bound = view.look.bound.harm_z if crossed == "harm" else view.look.bound.futility_z
    if crossed == "harm" and is_harm_elsewhere(view):
        beside = _harm_against(reading, bound)
        return line(f", harm on {harm_endpoint_name(view)} ", CROSSED, ": ", beside, ".")
    shown = z_number(bound, places=z_places(reading.z, bound)) if bound is not None else Span("")
    return line(f", {crossed} bound ", shown, NO_BREAK, CROSSED, ".")


def _harm_against(reading: Reading, bound: Estimate | None) -> Line:
    """ "z -2.611 against -2.380", of harm's own endpoint."""
    if bound is None or isinstance(bound, Absent) or reading.z_for_harm is None:
        return ()
    places = z_places(reading.z_for_harm, bound)
    z = z_number(reading.z_for_harm, places=places)
    return line(Z, NO_BREAK, z, " against ", z_number(bound, places=places))


def _reason(bound: Absent) -> str:
    return bound.reason[:1].upper() + bound.reason[1:].rstrip(".")


def _z_of(reading: Reading, bound: Estimate) -> Line:
    return line(Z, NO_BREAK, z_number(reading.z, places=z_places(reading.z, bound)))


def _mirror(bound: float, places: int) -> Span:
    """The lower bound of a symmetric region: the recorded bound with its sign turned."""
    return Span(MINUS + decimal(bound, places), value=bound)


# --- the figure -----------------------------------------------------------------------------------------


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
        lanes=_lanes(view),
        rows=_lane_rows(view),
        layout="two lanes" if two_lanes else "one lane",
    )


def _lanes(view: ClosedView) -> tuple[Lane, ...]:
    past = tuple(_past_lane(view, held) for held in view.readings[0].history)
    ahead = () if _all_over(view) else view.look.planned
    return (*past, _lane_now(view), *(_planned_lane(view, bound) for bound in ahead))


def _all_over(view: ClosedView) -> bool:
    """True when every reading has crossed: no bound ahead is a test any more."""
    return all(reading.verdict.first_crossed is not None for reading in view.readings)


def _past_lane(view: ClosedView, held: LookAsUsed) -> Lane:
    upper, lower = _bounds_shown(view, held.z, held.efficacy_z, held.number)
    firsts = {reading.verdict.first_crossed for reading in view.readings}
    return Lane(
        look=held.number,
        fraction=held.fraction,
        state="past",
        final=held.final,
        z=_z_shown(held.z, held.efficacy_z),
        upper=upper,
        lower=lower,
        crossed=held.number in firsts or _crossed_below_at(view, held.number),
        futility=_lower_shown(held.futility_z, held.final),
        harm=_harm_shown(view, held.harm_z),
    )


def _crossed_below_at(view: ClosedView, look: int) -> bool:
    """Whether a look held crossed futility or harm, in any reading."""
    held = (each for reading in view.readings for each in reading.history)
    below = (each.crossed for each in held if each.number == look)
    return any(crossed in ("futility", "harm") and _is_in_lane(view, crossed) for crossed in below)


def _is_in_lane(view: ClosedView, crossed: Crossed) -> bool:
    """False of harm that another z than the lane's has crossed."""
    return crossed != "none" and not (crossed == "harm" and is_harm_elsewhere(view))


def _lane_now(view: ClosedView) -> Lane:
    look, z = view.look, _z_now(view)
    upper, lower = _bounds_shown(view, z, look.bound.efficacy_z, look.number)
    crossed = any(_is_in_lane(view, each.verdict.crossed) for each in view.readings)
    fraction, shown = look.bound.information_fraction, _z_shown(z, look.bound.efficacy_z)
    below = _below_shown(view, look.bound)
    return Lane(look.number, fraction, "now", look.final, shown, upper, lower, crossed, *below)


def _planned_lane(view: ClosedView, bound: Bound) -> Lane:
    upper, lower = _bounds_shown(view, None, bound.efficacy_z, bound.number)
    fraction, below = bound.information_fraction, _below_shown(view, bound)
    return Lane(bound.number, fraction, "planned", bound.final, None, upper, lower, False, *below)


def _below_shown(view: ClosedView, bound: Bound) -> tuple[Span | None, Span | None]:
    """The futility and the harm bound of a lane."""
    return _lower_shown(bound.futility_z, bound.final), _harm_shown(view, bound.harm_z)


def _harm_shown(view: ClosedView, z: Estimate | None) -> Span | None:
    """Not in the lane of another z than the one it is for."""
    return None if is_harm_elsewhere(view) else _lower_shown(z, final=False)


def _lower_shown(z: Estimate | None, final: bool) -> Span | None:
    """A bound below; at a final look what is not efficacy has no zone of its own."""
    return None if z is None or isinstance(z, Absent) or final else z_number(z)


def _z_now(view: ClosedView) -> float | None:
    z = view.readings[0].z
    return None if isinstance(z, Absent) else z


def _z_shown(z: float | None, bound: Estimate) -> Span | None:
    return None if z is None else z_number(z, places=z_places(z, bound))


def _places(z: float | None, bound: Estimate) -> int:
    """The places of a bound beside the z of its look, if it has one yet."""
    return 3 if z is None else z_places(z, bound)


def _bounds_shown(
    view: ClosedView, z: float | None, bound: Estimate, look: int
) -> tuple[Span | None, Span | None]:
    """The bounds a lane draws: none where none exists, or where that reading had crossed before this look."""
    if isinstance(bound, Absent):
        return None, None
    places = _places(z, bound)
    upper, lower = z_number(bound, places=places), _mirror(bound, places)
    if view.masked and view.plan.design.sides == 1:
        tested = [not _crossed_before(reading, look) for reading in view.readings]
        return (upper if tested[0] else None), (lower if tested[1] else None)
    if _crossed_before(view.readings[0], look):
        return None, None
    return upper, (lower if view.plan.design.sides == 2 else None)


def _crossed_before(reading: Reading, look: int) -> bool:
    first = reading.verdict.first_crossed
    return first is not None and first < look


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
    ahead = () if _all_over(view) else view.look.planned
    now = _of_bound(view.look.bound, _z_now(view), view.readings[0].z_for_harm)
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
    bounds = tuple(or_dash(each.bound, _places(each.z, each.bound)) for each in columns)
    ratios = tuple(or_dash(each.ratio, 3) for each in columns)
    rows = (
        LaneRow(line("Information fraction"), line("Fraction"), fractions),
        LaneRow(line("Events"), line("Events"), tuple(count(each.events) for each in columns)),
        LaneRow(line(Z), line(Z), tuple(_z_shown(each.z, each.bound) for each in columns), rule_above=True),
        LaneRow(line(f"Efficacy bound{plus_minus}"), line("Efficacy"), bounds),
        LaneRow(line("as a hazard ratio"), line("as HR"), ratios, indent=True),
        *_rows_below(view, columns),
        *rows_under_lanes(view, [lane.look if lane.state != "planned" else None for lane in _lanes(view)]),
        LaneRow(
            line(f"Alpha spent, {_side_words(view)}"),
            line("Alpha"),
            tuple(alpha(each.spent) for each in columns),
        ),
    )
    return rows if not view.masked else tuple(row for row in rows if row.short_head != line("as HR"))


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
    of_it = replace(bound, head=line(f"Harm bound on {harm_endpoint_name(view)}{each}"))
    is_shown = view.plan.harm_endpoint_is_a_hypothesis
    return (*others, of_it) if is_shown else (*others, _harm_z_row(view, columns), of_it)


def _harm_z_row(view: ClosedView, columns: tuple[_Column, ...]) -> LaneRow:
    """z of harm's own endpoint, over the bound that it is for."""
    of_harm = tuple(None if each.z_for_harm is None else z_number(each.z_for_harm) for each in columns)
    return LaneRow(line(Z, f" of {harm_endpoint_name(view)}"), line("Harm ", Z), of_harm)


def _side_words(view: ClosedView) -> str:
    return "one-sided" if view.plan.design.sides == 1 else "each side"


# --- the tables -----------------------------------------------------------------------------------------


def _standing_tables(view: ClosedView) -> tuple[Table, ...]:
    """Both readings, further hypotheses or harm leave no room for the score itself: it stands folded."""
    own = _masked_tables(view) if view.masked else (_observed_beside_bound(view), _interval_table(view))
    return own if _is_score_folded(view) else (*own, _logrank_table(view))


def _is_score_folded(view: ClosedView) -> bool:
    return bool(view.hypotheses) or view.harm is not None or (view.masked and bool(view.plan.columns.strata))


def _folded_score(view: ClosedView) -> tuple[Table, ...]:
    """The score, where neither the page nor its strata show it."""
    return (_logrank_table(view),) if _is_score_folded(view) and not view.plan.columns.strata else ()


def _observed_beside_bound(view: ClosedView) -> Table:
    reading, bound = view.readings[0], view.look.bound
    places = z_places(reading.z, bound.efficacy_z)
    p_observed, p_bound = p_values(reading.p_one_sided, bound.efficacy_p_one_sided)
    ratio = view.cox if isinstance(view.cox, Absent) else view.cox.hazard_ratio
    return Table(
        caption=line(f"Look{NO_BREAK}{view.look.number}, {against(view)}"),
        columns=(Column(line("observed")), Column(line("efficacy bound"))),
        rows=(
            Row(line(Z), _pair(number(reading.z, places), or_dash(bound.efficacy_z, places))),
            Row(line(P, ", one-sided"), _pair(p_observed, _existing(bound.efficacy_p_one_sided, p_bound))),
            Row(line("Hazard ratio"), _pair(number(ratio, 3), or_dash(bound.efficacy_hazard_ratio, 3))),
            *hypothesis_rows(view),
        ),
    )


def _pair(left: Span, right: Span) -> tuple[Cell, Cell]:
    return Cell((left,)), Cell((right,))


def _existing(value: Estimate, span: Span) -> Span:
    return DASH if isinstance(value, Absent) else span


def _interval_table(view: ClosedView) -> Table:
    cox = view.cox
    shown = line(number(cox, 3)) if isinstance(cox, Absent) else interval(cox.ci_low, cox.ci_high, 3)
    return Table(
        caption=line(f"Hazard ratio, {level_text(cox_level(view))} interval"),
        columns=(Column(()),),
        rows=(
            Row(line(NOT_ADJUSTED), (Cell(shown),)),
            Row(line(f"Repeated, {level_text(_repeated_level(view))}"), (Cell(_repeated(view)),)),
        ),
    )


def _repeated_level(view: ClosedView) -> float:
    return 1.0 - 2.0 * view.plan.design.alpha_one_side


def _repeated(view: ClosedView) -> Line:
    """The interval that holds at every look, of the arm that the orientation is of."""
    repeated = view.readings[0].onwards.repeated_interval
    if isinstance(repeated, Absent):
        return line(DASH)
    return interval(repeated.ci_low, repeated.ci_high, 3)


def _masked_tables(view: ClosedView) -> tuple[Table, ...]:
    p_bound = view.look.bound.efficacy_p_one_sided
    *p_observed, p_at_bound = p_values(*(each.p_one_sided for each in view.readings), p_bound)
    z = [_z_and_bound(view, each) for each in view.readings]
    both = Table(
        caption=line(f"Look{NO_BREAK}{view.look.number}, both readings"),
        columns=tuple(Column(line(f"if {each.experimental} is experimental")) for each in view.readings),
        rows=(
            Row(line(Z), _pair(z[0][0], z[1][0])),
            Row(line("Efficacy bound"), _pair(z[0][1], z[1][1])),
            Row(line("Crossed"), _pair(*(_crossing_word(view, each) for each in view.readings))),
            Row(line(P, ", one-sided"), _pair(*p_observed)),
            Row(
                line("at the bound"),
                _pair(*(_tested(view, each, _existing(p_bound, p_at_bound)) for each in view.readings)),
                indent=True,
            ),
            *hypothesis_rows(view),
        ),
    )
    return both, _whichever_table(view)


def _z_and_bound(view: ClosedView, reading: Reading) -> tuple[Span, Span]:
    bound = view.look.bound.efficacy_z
    places = z_places(reading.z, bound)
    return number(reading.z, places), _tested(view, reading, or_dash(bound, places))


def _tested(view: ClosedView, reading: Reading, bound: Span) -> Span:
    """The bound, or a dash where this reading crossed before, so that nothing is tested here."""
    return DASH if is_over_running(view, reading) else bound


def _crossing_word(view: ClosedView, reading: Reading) -> Span:
    if is_over_running(view, reading):
        return Span(f"at look{NO_BREAK}{reading.verdict.first_crossed}", "crossed")
    crossed = reading.verdict.crossed
    return Span("none") if crossed == "none" else Span(crossed, "crossed")


def _whichever_table(view: ClosedView) -> Table:
    """What does not depend on which letter is which."""
    p_two = view.logrank if isinstance(view.logrank, Absent) else view.logrank.p_two_sided
    cox = view.cox
    rows = [Row(line(P, ", two-sided"), (Cell(p_values(p_two)),))]
    if isinstance(cox, Absent):
        rows.append(Row(line("Hazard ratio"), (Cell(line(number(cox, 3))),)))
    else:
        rows.append(Row(line("Hazard ratio"), (Cell(line(number(cox.hazard_ratio, 3))),)))
        limits = interval(cox.ci_low, cox.ci_high, 3)
        rows.append(Row(line(f"{level_text(cox.level)} interval, {NOT_ADJUSTED}"), (Cell(limits),)))
    of, other = (label_of(view, arm).letter for arm in view.arms)
    return Table(line(f"{of} against {other}, whichever is experimental"), (Column(()),), tuple(rows))


def _logrank_table(view: ClosedView) -> Table:
    result, plain = view.logrank, view.logrank_unstratified
    caption = line(f"Log-rank, {label_of(view, view.of).in_sentence}")
    if isinstance(result, Absent):
        return Table(caption, (Column(()),), (Row(line("Statistic"), (Cell(line(number(result, 3))),)),))
    rows = [
        Row(line("Observed events"), (Cell(line(count(int(result.observed)))),)),
        Row(line("Expected events"), (Cell(line(number(result.expected, 2))),)),
        Row(line("Variance"), (Cell(line(number(result.variance, 2))),)),
    ]
    if view.plan.columns.strata:
        z = plain if isinstance(plain, Absent) else plain.z
        rows.append(Row(line(Z, ", not stratified, descriptive"), (Cell(line(number(z, 3))),)))
    return Table(caption, (Column(()),), tuple(rows))


def _strata_table(view: ClosedView) -> tuple[Table, ...]:
    """O, E and V of each stratum, in the arm the orientation is of; only when the plan has strata."""
    if isinstance(view.logrank, Absent) or not view.plan.columns.strata:
        return ()
    strata = tuple(_stratum_row(view, view.logrank, index) for index in range(len(view.logrank.strata)))
    rows = (*strata, _all_strata_row(view, view.logrank))
    columns = ("subjects", "events", "observed", "expected", "variance")
    caption = line(f"Log-rank by stratum; observed and expected events {_in_arm(view)}")
    return (Table(caption, tuple(Column(line(name)) for name in columns), rows, line("Stratum")),)


def _in_arm(view: ClosedView) -> str:
    label = label_of(view, view.of)
    return f"in {label.in_sentence}" if view.masked else f"on {label.in_sentence}"


def _stratum_row(view: ClosedView, result: LogrankResult, index: int) -> Row:
    part = result.strata[index]
    counts = (count(part.subjects), count(part.events), *_score_spans(part))
    return Row(line(view.strata[part.stratum].label), tuple(Cell((span,)) for span in counts))


def _all_strata_row(view: ClosedView, result: LogrankResult) -> Row:
    information = view.look.information
    counts = (count(information.subjects), count(information.events), *_score_spans(result))
    return Row(line("All strata"), tuple(Cell((span,)) for span in counts))


def _score_spans(part: LogrankResult | LogrankStratum) -> tuple[Span, Span, Span]:
    return count(int(part.observed)), number(part.expected, 2), number(part.variance, 2)


def _looks_table(view: ClosedView) -> Table:
    """The figure in numbers: a row a look."""
    figure_rows = _lane_rows(view)
    lanes = _lanes(view)
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
        return HELD_BEFORE if lane.look in view.look.held_before else "held"
    return f"{view.look.kind}, shown" if not lane.final or view.look.kind == "final" else "final, shown"


def _on_another_scale(view: ClosedView) -> bool:
    """Whether a past look's fraction, as used, is of another total than the plan has now."""
    planned = view.look.information.planned_events
    return any(abs(held.events / planned - held.fraction) > 1e-9 for held in view.look.past)


def _note(view: ClosedView) -> Line:
    lanes = "Left lanes: if A is experimental; right: if B. "
    start = lanes if boundary_figure(view).layout == "two lanes" else ""
    past = [str(held.number) for held in view.look.past if not isinstance(held.efficacy_z, Absent)]
    used = "bounds and fractions" if _on_another_scale(view) else "bounds"
    as_used = f" Look{'s' if len(past) > 1 else ''} {listed(past)}: {used} as used." if past else ""
    return line(
        f"{start}{_grey_words(view)}{_hatched_words(view)} Dotted: a guide; bounds exist at looks.{as_used}",
        *_ahead_words(view),
        _no_bound_words(view),
        held_words(view),
        FINAL_WORDS if view.look.final and view.look.information.fraction < 1 else "",
        waiting_note(view),
    )


def _grey_words(view: ClosedView) -> str:
    if view.plan.harm is None or is_harm_elsewhere(view):
        return "Grey: beyond the efficacy bound."
    across = "at the other end" if view.masked else "below"
    return f"Grey: beyond efficacy; {across}, harm."


def _hatched_words(view: ClosedView) -> str:
    if view.plan.futility is None:
        return ""
    return f" Hatched: futility, {'binding' if view.plan.futility.binding else 'not binding'}."


def _no_bound_words(view: ClosedView) -> str:
    """Why a dash stands in place of a bound."""
    held = [(each.number, each.efficacy_z) for each in view.readings[0].history]
    bounds = [*held, (view.look.number, view.look.bound.efficacy_z)]
    return "".join(f" Look {look}: {bound.reason}." for look, bound in bounds if isinstance(bound, Absent))


def _ahead_words(view: ClosedView) -> tuple[Span, ...]:
    if _all_over(view):
        return ()
    spans: list[Span] = []
    for bound in view.look.planned:
        events = count(bound.events)
        spans += [Span(f" Look {bound.number}: if held at "), events, Span(" events.")]
    return tuple(spans)
