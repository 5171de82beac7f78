"""Sheet 5, Shape: does one hazard ratio tell the story?"""

from __future__ import annotations

import math

import numpy as np

from app.model.survival import ProportionalityResult, RestrictedMean, RestrictedMeanComparison, WeightedResult
from app.model.values import Absent
from app.sheets.arms import label_of, labels
from app.sheets.axis import display_unit
from app.sheets.blocks import Cell, Column, Line, LogLogFigure, LogLogLine, Row, Sheet, Table
from app.sheets.curves import against, in_unit
from app.sheets.methods import methods
from app.sheets.residuals import residual_figure, residual_table, residual_words
from app.sheets.words import (
    DESCRIPTIVE,
    P,
    Z,
    count,
    decimal,
    from_to,
    level_text,
    line,
    number,
    p_values,
    percent,
    z_number,
)
from app.survival import log_log_curve
from app.views.closed import ArmView, ClosedView

QUESTION = "Does one hazard ratio tell the story?"
SUSPECT = 0.05
X_TICKS = (0.1, 0.25, 0.5, 1.0, 2.0, 3.0, 6.0, 12.0, 24.0, 36.0, 60.0, 120.0, 240.0)
SHARES = (0.01, 0.02, 0.05, 0.1, 0.2, 0.5, 0.8, 0.95)  # with the event; ticks of the vertical axis


def shape_sheet(view: ClosedView) -> Sheet:
    shape = view.shape
    figures = [figure for figure in (log_log_figure(view), residual_figure(view)) if figure]
    asked = {
        "log-log": True,
        "residuals": True,
        "proportionality": True,
        "restricted-mean": shape.restricted_mean is not None,
        "weighted": shape.weighted is not None,
        "weighted-maximum": shape.weighted is not None and len(shape.weighted) > 1,
    }
    return Sheet(
        key="shape",
        number=5,
        name="Shape",
        question=QUESTION,
        answer=(_answer(view),),
        figure=figures[0] if figures else None,
        second_figure=figures[1] if len(figures) > 1 else None,
        tables=tuple(table for table in (_proportionality_table(view), _mean_table(view)) if table),
        folded=tuple(table for table in (_weighted_table(view),) if table),
        notes=(_note(view),),
        methods=methods(*(key for key, wanted in asked.items() if wanted)),
        figure_table=_figure_table(view),
        second_figure_table=residual_table(view),
    )


def _answer(view: ClosedView) -> Line:
    test, events = view.shape.proportionality, view.look.information.events
    if isinstance(test, Absent):
        return line("Whether the hazard ratio changes with time cannot be tested here.")
    p = line(P, " ", *p_values(test.p))
    if test.p < SUSPECT:
        return line("The hazard ratio seems to change with time: ", p, ", from ", count(events), " events.")
    return line(
        "No change of the hazard ratio with time is seen: ",
        p,
        ", from ",
        count(events),
        " events. Such a test has little power.",
    )


def _proportionality_table(view: ClosedView) -> Table:
    test = view.shape.proportionality
    missing = Cell(line(number(test, 3))) if isinstance(test, Absent) else None
    known = None if isinstance(test, Absent) else test
    return Table(
        caption=line(f"Proportional hazards, {DESCRIPTIVE}"),
        columns=(Column(()),),
        rows=(
            Row(line("Chi-square, 1 degree of freedom"), (missing or _chi_square(known),)),
            Row(line(P), (missing or _p(known),)),
        ),
    )


def _chi_square(test: ProportionalityResult | None) -> Cell:
    return Cell(line(number(test.chi_square, 3)) if test else ())


def _p(test: ProportionalityResult | WeightedResult | RestrictedMeanComparison | None) -> Cell:
    if test is None:
        return Cell(())
    value = test.p if isinstance(test, ProportionalityResult) else test.p_two_sided
    return Cell(line(*p_values(value)))


def _mean_table(view: ClosedView) -> Table | None:
    compared, at = view.shape.restricted_mean, view.plan.analysis.restricted_mean_at
    if compared is None or at is None:
        return None
    unit, scale = display_unit(view.look.time_unit)
    caption = line(f"Mean without event to {decimal(at / scale, 1)} {unit}, {DESCRIPTIVE}")
    columns = tuple(Column(line(label.name), arm=label) for label in labels(view))
    if isinstance(compared, Absent):
        cell = Cell(line(number(compared, 1)))
        return Table(caption, columns, (Row(line(f"Mean, {unit}"), (cell, cell)),))
    means = (compared.experimental, compared.control)
    return Table(
        caption,
        columns,
        (
            Row(line(f"Mean, {unit}"), tuple(_mean(mean, scale) for mean in means)),
            Row(line(f"Difference, {unit}"), (_difference(compared, scale), Cell(()))),
            Row(line(P, ", two-sided"), (_p(compared), Cell(()))),
        ),
    )


def _mean(mean: RestrictedMean, scale: float) -> Cell:
    return Cell(line(in_unit(mean.mean, scale)))


def _difference(compared: RestrictedMeanComparison, scale: float) -> Cell:
    limits = from_to(in_unit(compared.ci_low, scale), in_unit(compared.ci_high, scale))
    return Cell(line(in_unit(compared.difference, scale)), limits)


def _weighted_table(view: ClosedView) -> Table | None:
    weighted, largest = view.shape.weighted, view.shape.weighted_maximum
    if weighted is None:
        return None
    rows = [
        _weighted_row(line(f"({rho:g}, {gamma:g})"), test)
        for (rho, gamma), test in zip(view.plan.analysis.weights, weighted, strict=True)
    ]
    if len(weighted) > 1 and largest is not None:
        words = line("Largest of them")
        if isinstance(largest, Absent):
            rows.append(_weighted_row(words, largest))
        else:
            rows.append(Row(words, _z_and_p(largest.z, largest.p_two_sided)))
    return Table(
        caption=line(f"Weighted tests, {DESCRIPTIVE}"),
        columns=(Column(line(Z)), Column(line(P, ", two-sided"))),
        rows=tuple(rows),
        corner=line("Weight, rho and gamma"),
    )


def _weighted_row(words: Line, test: WeightedResult | Absent) -> Row:
    if isinstance(test, Absent):
        return Row(words, (Cell(line(number(test, 3))), Cell(line(number(test, 3)))))
    return Row(words, _z_and_p(test.z, test.p_two_sided))


def _z_and_p(z: float, p: float) -> tuple[Cell, Cell]:
    return Cell(line(z_number(z))), Cell(line(*p_values(p)))


def _note(view: ClosedView) -> Line:
    level, compared = level_text(view.plan.analysis.confidence), against(view)
    return line(
        f"{compared[:1].upper()}{compared[1:]}, {level} intervals. {residual_words(view)} "
        "Nothing here is tested against the boundary. With few events a change is easily missed; the curves "
        "begin, and the smooth ends, on few."
    )


def log_log_figure(view: ClosedView) -> LogLogFigure | None:
    """None where an arm has no event to draw."""
    unit, scale = display_unit(view.look.time_unit)
    lines = tuple(_line(view, arm, scale) for arm in view.arms)
    if not all(each.log_time for each in lines):
        return None
    names = " and ".join(label.name for label in labels(view))
    return LogLogFigure(
        title=f"log(−log) of event-free survival, {names}",
        description=f"Two step lines over {unit} on a log scale; parallel lines mean proportional hazards.",
        x_title=f"{unit.capitalize()}, log scale",
        y_title="With the event, %, on the log(−log) scale",
        x_ticks=_x_ticks(lines),
        y_ticks=_y_ticks(lines),
        lines=lines,
    )


def _line(view: ClosedView, arm: ArmView, scale: float) -> LogLogLine:
    points = log_log_curve(arm.curve)
    log_time = (points.log_time - math.log(scale)).tolist()
    return LogLogLine(label_of(view, arm), tuple(log_time), tuple(points.log_minus_log.tolist()))


def _x_ticks(lines: tuple[LogLogLine, ...]) -> tuple[tuple[float, str], ...]:
    low = min(line_.log_time[0] for line_ in lines)
    high = max(line_.log_time[-1] for line_ in lines)
    inside = [(math.log(tick), f"{tick:g}") for tick in X_TICKS if low <= math.log(tick) <= high]
    if len(inside) > 1:
        return tuple(inside)
    ends = (low, high) if high > low else (low - 0.5, low + 0.5)
    return tuple((end, f"{math.exp(end):.3g}") for end in ends)


def _y_ticks(lines: tuple[LogLogLine, ...]) -> tuple[tuple[float, str], ...]:
    low = min(min(each.log_minus_log) for each in lines)
    high = max(max(each.log_minus_log) for each in lines)
    places = [(math.log(-math.log1p(-share)), f"{100 * share:g}") for share in SHARES]
    above = [tick for tick in places if tick[0] >= high][:1]
    below = [tick for tick in places if tick[0] <= low][-1:]
    inside = [tick for tick in places if low < tick[0] < high]
    return tuple(below + inside + above) or (places[0], places[-1])


def _figure_table(view: ClosedView) -> Table | None:
    """The figure in numbers: each curve at its own quarters of events."""
    unit, scale = display_unit(view.look.time_unit)
    rows: list[Row] = []
    for arm in view.arms:
        at = np.flatnonzero(arm.curve.events > 0)
        chosen = at[np.unique(np.linspace(0, at.size - 1, 5).astype(int))] if at.size else at
        rows += [
            Row(
                line(label_of(view, arm).name),
                (
                    Cell(line(in_unit(float(arm.curve.time[index]), scale))),
                    Cell(line(percent(float(arm.curve.survival[index])))),
                ),
            )
            for index in chosen
        ]
    if not rows:
        return None
    columns = (Column(line(unit.capitalize())), Column(line("Event-free, %")))
    return Table(line("Points of the log(−log) curves"), columns, tuple(rows), line("Arm"))
