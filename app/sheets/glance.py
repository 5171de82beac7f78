"""At a glance: a look in five lines."""

from __future__ import annotations

import math
from collections.abc import Sequence

from app.model.boundary import BELOW
from app.model.values import Absent
from app.sheets.arms import label_of
from app.sheets.axis import time_axis
from app.sheets.blocks import (
    GlanceRow,
    InformationStrip,
    IntervalMark,
    IntervalStrip,
    Line,
    Sheet,
    Span,
    ZStrip,
)
from app.sheets.boundary_answer import boundary_answer, only_efficacy_counts
from app.sheets.boundary_figure import boundary_figure
from app.sheets.curves import (
    NOT_ADJUSTED,
    event_free_sentence,
    limits_at,
    open_curves_sheet,
    survival_at,
    time_words,
)
from app.sheets.extract import changed_events_sentence, changes_figure, data_sentence, open_data_sheet
from app.sheets.frame import Surroundings
from app.sheets.further import hypotheses_sentence
from app.sheets.information import (
    counted_by,
    follow_up_sentence,
    information_method,
    information_sentence,
    open_information_sheet,
)
from app.sheets.methods import methods, spending_key
from app.sheets.words import CROSSED, NO_BREAK, Z, count, interval, level_text, line, number, of_total
from app.views.closed import ArmView, ClosedView
from app.views.open import OpenView
from app.views.reading import Reading

NO_BOUND_HERE = "no efficacy boundary applies at this look."


def glance_sheet(view: ClosedView, around: Surroundings, record: Line) -> Sheet:
    return Sheet(
        key="glance",
        number=None,
        name="At a glance",
        question=f"What does look{NO_BREAK}{view.look.number} show, in five lines?",
        answer=(_answer(view),),
        glance=(
            GlanceRow(
                1,
                "Data",
                "data",
                line(data_sentence(view), " ", changed_events_sentence(view)),
                changes_figure(view),
            ),
            GlanceRow(
                2,
                "Information",
                "information",
                _information_line(view, around),
                _information_strip(around, view.look.number),
            ),
            GlanceRow(
                3,
                "Curves",
                "curves",
                line(event_free_sentence(view), " ", _ratio_words(view)),
                _curves_strip(view),
            ),
            GlanceRow(4, "Boundary", "boundary", _boundary_line(view), _z_strip(view)),
            GlanceRow(9, "Record", "record", record, None),
        ),
        methods=methods(
            information_method(view),
            "kaplan-meier",
            "cox",
            "logrank",
            spending_key(view.plan.efficacy.spending),
            "boundary",
            masked=view.masked,
        ),
    )


def _answer(view: ClosedView) -> Line:
    """ "With 384 of 538 planned events, no boundary was crossed." """
    information = view.look.information
    start = line("With ", of_total(information.events, information.planned_events), " planned events, ")
    if isinstance(view.logrank, Absent):
        return line(start, "the test cannot be computed.")
    if not view.masked:
        return line(start, _crossing_words(view))
    return line(start, _crossing_words_masked(view))


def _crossing_words_masked(view: ClosedView) -> Line:
    crossed = [reading for reading in view.readings if reading.verdict.first_crossed is not None]
    below = [reading for reading in view.readings if reading.verdict.crossed in BELOW]
    if not crossed and below:
        return _below_words(below)
    if not crossed and isinstance(view.look.bound.efficacy_z, Absent):
        return line(NO_BOUND_HERE)
    if not crossed:
        return line(f"{_nothing_crossed(view)} in either reading.")
    if len(crossed) == 2:
        return line("the boundary was ", CROSSED, " in both readings.")
    first = crossed[0].verdict.first_crossed
    at = "" if first == view.look.number else f" at look{NO_BREAK}{first}"
    return line(
        "the boundary was ",
        CROSSED,
        f"{at} if{NO_BREAK}{crossed[0].experimental}{NO_BREAK}is experimental, and not otherwise.",
    )


def _below_words(readings: Sequence[Reading]) -> Line:
    """ "the futility boundary was crossed if B is experimental." """
    said = [
        line(
            f"the {each.verdict.crossed} boundary was ",
            CROSSED,
            f" if{NO_BREAK}{each.experimental}{NO_BREAK}is experimental",
        )
        for each in readings
    ]
    return line(said[0], *(line(" and ", more) for more in said[1:]), ".")


def _nothing_crossed(view: ClosedView) -> str:
    return "efficacy was not crossed" if only_efficacy_counts(view) else "no boundary was crossed"


def _crossing_words(view: ClosedView) -> Line:
    verdict = view.readings[0].verdict
    if verdict.crossed in BELOW and verdict.first_crossed is None:
        return line(f"the {verdict.crossed} boundary was ", CROSSED, ".")
    if verdict.first_crossed is None and isinstance(view.look.bound.efficacy_z, Absent):
        return line(NO_BOUND_HERE)
    if verdict.first_crossed is None:
        return line(f"{_nothing_crossed(view)}.")
    if verdict.first_crossed < view.look.number:
        return line("the boundary had been ", CROSSED, f" at look{NO_BREAK}{verdict.first_crossed}.")
    if verdict.crossed == "control":
        return line("the boundary in favour of control was ", CROSSED, ".")
    return line(f"the {verdict.crossed} boundary was ", CROSSED, ".")


def _information_line(view: ClosedView, around: Surroundings) -> Line:
    information = view.look.information
    planned = around.planned_for(view.look.number)
    said = information_sentence(
        information.events,
        information.planned_events,
        information.fraction,
        planned,
        by=counted_by(view),
    )
    return line(said, " ", follow_up_sentence(view))


def _information_strip(around: Surroundings, shown: int) -> InformationStrip:
    held = tuple((look.fraction, count(look.events)) for look in around.looks if look.number <= shown)
    return InformationStrip(
        title="Information so far",
        description="Looks held, on the scale of information from 0 to 1.",
        held=held,
        planned=around.planned,
        total=Span("planned") if around.by == "score variance" else count(around.planned_events),
    )


def _ratio_words(view: ClosedView) -> Line:
    cox = view.cox
    if isinstance(cox, Absent):
        return line(f"The hazard ratio cannot be estimated: {cox.reason}.")
    limits = interval(cox.ci_low, cox.ci_high, 3)
    of, other = (label_of(view, arm).letter for arm in view.arms)
    which = f"Hazard ratio of {of} to {other} " if view.masked else "Hazard ratio "
    ratio = line(which, number(cox.hazard_ratio, 3))
    return line(ratio, f" ({level_text(cox.level)} interval ", limits, f", {NOT_ADJUSTED}).")


def _curves_strip(view: ClosedView) -> IntervalStrip:
    axis = time_axis(tuple(arm.curve for arm in view.arms), view.look.time_unit)
    return IntervalStrip(
        title=f"Event-free at {time_words(axis, axis.named)}",
        description=f"Percent event-free at {time_words(axis, axis.named)}, with its interval, by arm.",
        unit="Event-free, %",
        ticks=(0.0, 25.0, 50.0, 75.0, 100.0),
        marks=tuple(mark for arm in view.arms for mark in _marks(view, arm, axis.named * axis.scale)),
    )


def _marks(view: ClosedView, arm: ArmView, time: float) -> tuple[IntervalMark, ...]:
    """The arm's mark; none where its curve says nothing at this time."""
    survival = survival_at(arm.curve, time)
    if isinstance(survival, Absent):
        return ()
    low, high = limits_at(arm.curve, time)
    known = not (math.isnan(low) or math.isnan(high))
    limits = (100 * low, 100 * high) if known else (None, None)
    return (IntervalMark(label_of(view, arm), 100 * survival, *limits),)


def _boundary_line(view: ClosedView) -> Line:
    answer = boundary_answer(view)
    said = answer[0] if len(answer) == 1 else line(answer[0], " ", answer[1])
    further = hypotheses_sentence(view)
    return line(said, further) if view.masked else line(said, _needed_next(view), further)


def _needed_next(view: ClosedView) -> Line:
    """ " At look 4 z 2.005 is needed, a hazard ratio of 0.841 or less." """
    if not view.look.planned or view.readings[0].verdict.first_crossed is not None:
        return ()
    bound = view.look.planned[0]
    if isinstance(bound.efficacy_z, Absent) or isinstance(bound.efficacy_hazard_ratio, Absent):
        return ()
    z = line(Z, NO_BREAK, number(bound.efficacy_z, 3))
    side = "less" if view.plan.endpoint.direction == 1 else "more"
    ratio = number(bound.efficacy_hazard_ratio, 3)
    return line(
        f" At look{NO_BREAK}{bound.number} ", z, " is needed, a hazard ratio of ", ratio, f" or {side}."
    )


def _z_strip(view: ClosedView) -> ZStrip:
    figure = boundary_figure(view)
    lane = next(lane for lane in figure.lanes if lane.state == "now")
    return ZStrip(
        title="z against its bound",
        description="The z of this look on the scale of its efficacy bound.",
        z=lane.z,
        upper=lane.upper,
        lower=lane.lower,
        crossed=lane.crossed,
        futility=lane.futility,
        harm=lane.harm,
        masked=figure.layout == "two lanes",
    )


def open_glance_sheet(view: OpenView, around: Surroundings) -> Sheet:
    look = view.look
    planned = around.planned_for(look.number)
    curves = open_curves_sheet(view)
    rows = (
        GlanceRow(1, "Data", "data", open_data_sheet(view).answer[0], None),
        GlanceRow(
            2,
            "Information",
            "information",
            open_information_sheet(view, planned).answer[0],
            _information_strip(around, look.number),
        ),
        GlanceRow(3, "Curves", "curves", curves.answer[0], None),
    )
    answer = line(
        "The trial has ", of_total(look.events, look.planned_events), " planned events, both arms together."
    )
    return Sheet(
        key="glance",
        number=None,
        name="At a glance",
        question=f"What does look{NO_BREAK}{look.number} show to the open side?",
        answer=(answer,),
        glance=rows,
        methods=methods("information", "kaplan-meier"),
    )
