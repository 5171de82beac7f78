"""Sheet 3, Curves: what happened to the patients?"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from app.model.survival import CoxResult, SurvivalCurve
from app.model.values import Absent, Bools, Estimate, Floats
from app.sheets.arms import label_of
from app.sheets.axis import FEWEST_AT_RISK, TimeAxis, time_axis
from app.sheets.blocks import (
    ArmLabel,
    AtRiskRow,
    Cell,
    Column,
    CurveLine,
    CurvesFigure,
    Line,
    Row,
    Sheet,
    Span,
    Table,
)
from app.sheets.methods import methods
from app.sheets.words import (
    DESCRIPTIVE,
    NO_BREAK,
    NO_BREAK_HYPHEN,
    decimal,
    from_to,
    interval,
    level_text,
    line,
    listed,
    number,
    of_total,
    percent,
)
from app.views.closed import ArmView, ClosedView
from app.views.open import OpenView

QUESTION = "What happened to the patients?"
MOST_STROKES = 250
NOT_ADJUSTED = "not adjusted for looks"
NOT_FOLLOWED = Absent("not estimable: nobody was followed that long")


@dataclass(frozen=True, eq=False)
class CurveShown:
    """One curve with its name and denominators, whichever side it is for (label None: pooled)."""

    label: ArmLabel | None
    curve: SurvivalCurve
    subjects: int
    events: int
    follow_up: Estimate


def curves_sheet(view: ClosedView) -> Sheet:
    shown = tuple(_shown(view, arm) for arm in view.arms)
    axis = time_axis(tuple(item.curve for item in shown), view.look.time_unit)
    return Sheet(
        key="curves",
        number=3,
        name="Curves",
        question=QUESTION,
        answer=(event_free_sentence(view),),
        figure=curves_figure(shown, axis),
        tables=(_estimates(shown, axis), hazard_ratio_table(view)),
        folded=(*_landmark_table(view, axis), *_hypotheses_estimates(view)),
        notes=(_note(shown, axis),),
        methods=methods(
            "kaplan-meier",
            "greenwood",
            "median",
            "follow-up",
            "cox",
            *(["landmark"] if view.shape.landmarks else []),
        ),
        figure_table=_figure_table(shown, axis),
    )


def open_curves_sheet(view: OpenView) -> Sheet:
    look = view.look
    shown = (CurveShown(None, look.curve, look.subjects, look.events, look.follow_up_median),)
    axis = time_axis((look.curve,), look.time_unit)
    return Sheet(
        key="curves",
        number=3,
        name="Curves",
        question=QUESTION,
        answer=(_sentence(shown, axis),),
        figure=curves_figure(shown, axis),
        tables=(_estimates(shown, axis),),
        notes=(_note(shown, axis),),
        methods=methods("kaplan-meier", "greenwood", "median", "follow-up"),
        figure_table=_figure_table(shown, axis),
    )


def _shown(view: ClosedView, arm: ArmView) -> CurveShown:
    counts = arm.counts
    return CurveShown(label_of(view, arm), arm.curve, counts.subjects, counts.events, counts.follow_up_median)


def event_free_sentence(view: ClosedView) -> Line:
    """ "At 24 months 57.5% on tablet and 48.2% on placebo were event-free." """
    shown = tuple(_shown(view, arm) for arm in view.arms)
    return _sentence(shown, time_axis(tuple(item.curve for item in shown), view.look.time_unit))


def _sentence(shown: Sequence[CurveShown], axis: TimeAxis) -> Line:
    start = line(f"At {time_words(axis, axis.named)} ")
    parts = [_event_free(item, axis.named * axis.scale) for item in shown]
    whose = "" if len(shown) > 1 else " of all subjects"
    end = f"{whose} were event{NO_BREAK_HYPHEN}free."
    return line(start, *_joined(parts), end)


def _event_free(item: CurveShown, time: float) -> Line:
    """ "57.5% on tablet"."""
    share = percent(survival_at(item.curve, time))
    sign = "" if share.value is None else "%"
    where = "" if item.label is None else f" {preposition(item.label)}{NO_BREAK}{item.label.in_sentence}"
    return line(share, f"{sign}{where}")


def _joined(parts: list[Line]) -> tuple[Line, ...]:
    return (parts[0],) if len(parts) == 1 else (parts[0], line(" and "), parts[1])


def preposition(label: ArmLabel) -> str:
    """Patients are "on tablet" but "in arm A"."""
    return "in" if label.in_sentence.startswith("arm" + NO_BREAK) else "on"


def time_words(axis: TimeAxis, at: float) -> str:
    """ "24 months", "1 month"."""
    return f"{said_time(at)}{NO_BREAK}{axis.unit.removesuffix('s') if at == 1 else axis.unit}"


def said_time(value: float) -> str:
    return decimal(value, 0) if value == int(value) else f"{value:g}"


def survival_at(curve: SurvivalCurve, time: float) -> Estimate:
    """The right-continuous curve at `time`, 0-1; one that ends above 0 says nothing after its last time."""
    if time > curve.time[-1] and curve.survival[-1] > 0.0:
        return NOT_FOLLOWED
    return _before(curve.survival, _index_at(curve, time), 1.0)


def limits_at(curve: SurvivalCurve, time: float) -> tuple[float, float]:
    """The limits of the curve at `time`, NaN where there are none."""
    index = _index_at(curve, time)
    return _before(curve.ci_low, index, math.nan), _before(curve.ci_high, index, math.nan)


def _index_at(curve: SurvivalCurve, time: float) -> int:
    return int(np.searchsorted(curve.time, time, side="right"))


def _before(values: Floats, index: int, start: float) -> float:
    return start if index == 0 else float(values[index - 1])


def curves_figure(shown: Sequence[CurveShown], axis: TimeAxis) -> CurvesFigure:
    names = listed([item.label.name for item in shown if item.label]) or "All subjects"
    return CurvesFigure(
        title=f"Event-free survival, {names}",
        description=f"Kaplan-Meier curves in percent from 0 to {time_words(axis, axis.end)} since "
        "randomisation, with numbers at risk, events and censored under the axis.",
        x_title=f"{axis.unit.capitalize()} since randomisation",
        y_title="Event-free, %",
        ticks=axis.ticks,
        lines=tuple(_curve_line(item, axis) for item in shown),
    )


def _curve_line(item: CurveShown, axis: TimeAxis) -> CurveLine:
    curve = item.curve
    inside = (curve.time <= axis.end * axis.scale) & (curve.events > 0)
    return CurveLine(
        arm=item.label,
        time=(0.0, *axis.shown(curve.time[inside]).tolist()),
        survival=(100.0, *(100 * curve.survival[inside]).tolist()),
        ci_low=(None, *_limits(curve.ci_low[inside])),
        ci_high=(None, *_limits(curve.ci_high[inside])),
        censored_at=_strokes(curve, axis),
        rows=rows_at_ticks(curve, item.subjects, axis),
        label=item.label.name if item.label else "All subjects",
        last=float(axis.shown(curve.time[-1:])[0]) if curve.time.size else 0.0,
    )


def _limits(values: Floats) -> tuple[float | None, ...]:
    return tuple(None if math.isnan(value) else 100 * float(value) for value in values)


def _strokes(curve: SurvivalCurve, axis: TimeAxis) -> tuple[tuple[float, float], ...]:
    """Censoring strokes inside the axis; none when there would be too many to tell apart."""
    inside = _censorings_shown(curve, axis)
    if _too_many(inside):
        return ()
    times = axis.shown(curve.time[inside]).tolist()
    return tuple(zip(times, (100 * curve.survival[inside]).tolist(), strict=True))


def _censorings_shown(curve: SurvivalCurve, axis: TimeAxis) -> Bools:
    inside: Bools = (curve.censored > 0) & (curve.time <= axis.end * axis.scale)
    return inside


def _too_many(strokes: Bools) -> bool:
    return int(strokes.sum()) > MOST_STROKES


def rows_at_ticks(curve: SurvivalCurve, subjects: int, axis: TimeAxis) -> AtRiskRow:
    """At risk just before each tick, events and censored before it: the three add up to the arm."""
    before = np.searchsorted(curve.time, np.array(axis.ticks) * axis.scale, side="left")
    events = np.concatenate(([0], np.cumsum(curve.events)))[before]
    censored = np.concatenate(([0], np.cumsum(curve.censored)))[before]
    at_risk = subjects - events - censored
    return AtRiskRow(tuple(at_risk.tolist()), tuple(events.tolist()), tuple(censored.tolist()))


def _estimates(shown: Sequence[CurveShown], axis: TimeAxis) -> Table:
    named = sorted({at for at in (axis.named / 2, axis.named) if at == int(at)})
    return Table(
        caption=line(f"Estimates with {level_text(shown[0].curve.level)} intervals"),
        columns=tuple(
            Column(line(item.label.name if item.label else "All subjects"), arm=item.label) for item in shown
        ),
        rows=(
            Row(
                line("Events of subjects"),
                tuple(Cell(of_total(item.events, item.subjects)) for item in shown),
            ),
            Row(line(f"Median, {axis.unit}"), tuple(_median(item.curve, axis) for item in shown)),
            *(
                Row(
                    line(f"Event{NO_BREAK_HYPHEN}free at {time_words(axis, at)}, %"),
                    tuple(_survival_cell(item.curve, at * axis.scale) for item in shown),
                )
                for at in named
            ),
            Row(
                line(f"Follow-up, {axis.unit}"),
                tuple(Cell(line(in_unit(item.follow_up, axis.scale))) for item in shown),
            ),
        ),
    )


def _hypotheses_estimates(view: ClosedView) -> tuple[Table, ...]:
    """The same estimates on the endpoint of each further hypothesis."""
    tables = []
    for each in view.hypotheses:
        shown = tuple(_shown(each.view, arm) for arm in each.view.arms)
        axis = time_axis(tuple(item.curve for item in shown), each.view.look.time_unit)
        table = _estimates(shown, axis)
        caption = line(each.hypothesis.name, f", estimates with {level_text(shown[0].curve.level)} intervals")
        tables.append(replace(table, caption=caption))
    return tuple(tables)


def in_unit(value: Estimate, scale: float) -> Span:
    """A time of the record in the unit shown, to one decimal."""
    if isinstance(value, Absent):
        return number(value, 1)
    return Span(decimal(value / scale, 1), value=value)


def _median(curve: SurvivalCurve, axis: TimeAxis) -> Cell:
    limits = from_to(in_unit(curve.median_ci_low, axis.scale), in_unit(curve.median_ci_high, axis.scale))
    return Cell(line(in_unit(curve.median, axis.scale)), limits)


def _survival_cell(curve: SurvivalCurve, time: float) -> Cell:
    survival = survival_at(curve, time)
    if isinstance(survival, Absent):
        return Cell(line(percent(survival)))
    return Cell(line(percent(survival)), interval(*limits_at(curve, time), 1, scale=100))


def hazard_ratio_table(view: ClosedView) -> Table:
    """The Cox hazard ratio of the view's orientation, with the interval no look has widened."""
    return Table(
        caption=line(f"Hazard ratio, {against(view)}"),
        columns=(Column(()),),
        rows=(Row(line(f"{level_text(cox_level(view))} interval, {NOT_ADJUSTED}"), (_ratio(view.cox),)),),
    )


def _landmark_table(view: ClosedView, axis: TimeAxis) -> tuple[Table, ...]:
    """The arms' difference at the times fixed in the plan; none where it fixes none."""
    if not view.shape.landmarks:
        return ()
    rows = (
        Row(
            line(f"At {time_words(axis, compared.at / axis.scale)}"),
            (
                Cell(
                    line(percent(compared.difference)),
                    interval(compared.ci_low, compared.ci_high, 1, scale=100),
                ),
            ),
        )
        for compared in view.shape.landmarks
    )
    intervals = f"{level_text(cox_level(view))} intervals"
    caption = line(f"Difference in event{NO_BREAK_HYPHEN}free %, {against(view)}, {intervals}, {DESCRIPTIVE}")
    columns = (Column(line("difference")),)
    return (Table(caption, columns, tuple(rows), line("Landmark")),)


def cox_level(view: ClosedView) -> float:
    """The level asked for, which stands also where the ratio cannot be estimated."""
    return view.plan.analysis.confidence


def _ratio(cox: CoxResult | Absent) -> Cell:
    if isinstance(cox, Absent):
        return Cell(line(number(cox, 3)))
    return Cell(line(number(cox.hazard_ratio, 3)), interval(cox.ci_low, cox.ci_high, 3))


def against(view: ClosedView) -> str:
    """ "tablet against placebo", "arm A against arm B"."""
    of, other = (label_of(view, arm).in_sentence for arm in view.arms)
    return f"{of} against {other}"


def _note(shown: Sequence[CurveShown], axis: TimeAxis) -> Line:
    many = any(_too_many(_censorings_shown(item.curve, axis)) for item in shown)
    strokes = f"Censorings at more than {MOST_STROKES} times: not drawn." if many else "Strokes: censored."
    months = " A month is 30.4375 days." if axis.unit == "months" and axis.scale != 1 else ""
    return line(
        f"Bands and intervals: {shown[0].curve.interval}, pointwise. "
        f"Follow-up: median, reverse Kaplan-Meier. {strokes} "
        "Events and censored: before the tick; with those at risk they add up to the subjects. "
        f"{_end_words(axis, len(shown))}{months}"
    )


def _end_words(axis: TimeAxis, curves: int) -> str:
    """The rule by which the axis ends, as it applied here."""
    if axis.enough_at_risk:
        arms = "each arm" if curves > 1 else "all"
        return f"The axis ends at the last tick with {FEWEST_AT_RISK} at risk in {arms}."
    arm = " in an arm" if curves > 1 else ""
    return f"Fewer than {FEWEST_AT_RISK}{arm} are at risk at the first tick: all follow-up is shown."


def _figure_table(shown: Sequence[CurveShown], axis: TimeAxis) -> Table:
    """The figure in numbers: every curve at every tick."""
    heads: list[Column] = []
    for item in shown:
        name = item.label.name if item.label else "All subjects"
        heads += [
            Column(line(f"{name}, {what}"), arm=item.label)
            for what in (f"event{NO_BREAK_HYPHEN}free, %", "interval", "at risk")
        ]
    rows = []
    for index, tick in enumerate(axis.ticks):
        cells: list[Cell] = []
        for item in shown:
            estimated = _survival_cell(item.curve, tick * axis.scale)
            cells += [Cell(estimated.line), Cell(estimated.below)]
            at_risk = rows_at_ticks(item.curve, item.subjects, axis).at_risk[index]
            cells.append(Cell(line(str(at_risk))))
        rows.append(Row(line(said_time(tick)), tuple(cells)))
    corner = line(f"{axis.unit.capitalize()}")
    return Table(line("The curves at the ticks of the axis"), tuple(heads), tuple(rows), corner)
