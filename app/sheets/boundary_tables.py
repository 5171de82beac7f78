"""The tables of the Boundary sheet: this look beside its bound, and the score that it rests on."""

from __future__ import annotations

from app.model.survival import LogrankResult, LogrankStratum
from app.model.values import Absent, Estimate
from app.sheets.arms import label_of
from app.sheets.blocks import Cell, Column, Line, Row, Span, Table
from app.sheets.curves import NOT_ADJUSTED, against, cox_level
from app.sheets.further import hypothesis_rows
from app.sheets.words import (
    DASH,
    NO_BREAK,
    P,
    Z,
    count,
    interval,
    level_text,
    line,
    number,
    or_dash,
    p_values,
    z_places,
)
from app.views.closed import ClosedView
from app.views.reading import Reading


def standing_tables(view: ClosedView) -> tuple[Table, ...]:
    """Both readings, further hypotheses or harm leave no room for the score itself: it stands folded."""
    own = _masked_tables(view) if view.masked else (_observed_beside_bound(view), _interval_table(view))
    return own if _is_score_folded(view) else (*own, _logrank_table(view))


def _is_score_folded(view: ClosedView) -> bool:
    return bool(view.hypotheses) or view.harm is not None or (view.masked and bool(view.plan.columns.strata))


def folded_score(view: ClosedView) -> tuple[Table, ...]:
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
            Row(line(f"{NOT_ADJUSTED[:1].upper()}{NOT_ADJUSTED[1:]}"), (Cell(shown),)),
            Row(line(_repeated_words(view)), (Cell(_repeated(view)),)),
        ),
    )


def _repeated_words(view: ClosedView) -> str:
    """Its level follows from alpha: said where it is not that of the caption."""
    level = level_text(1.0 - 2.0 * view.plan.design.alpha_one_side)
    return "Repeated over looks" + ("" if level == level_text(cox_level(view)) else f", {level}")


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
    return DASH if reading.crossed_before(view.look.number) else bound


def _crossing_word(view: ClosedView, reading: Reading) -> Span:
    if reading.crossed_before(view.look.number):
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


def strata_table(view: ClosedView) -> tuple[Table, ...]:
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
