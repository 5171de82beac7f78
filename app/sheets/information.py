"""Sheet 2, Information: how much do we know?"""

from __future__ import annotations

from datetime import date

from app.model.extract import TimeUnit
from app.model.look import CalendarCounts
from app.model.values import Absent, Estimate
from app.sheets.arms import label_of
from app.sheets.axis import display_unit
from app.sheets.blocks import CalendarFigure, Cell, Column, CountedBy, Line, Row, Series, Sheet, Span, Table
from app.sheets.curves import in_unit, preposition
from app.sheets.methods import methods
from app.sheets.words import NO_BREAK, count, day_text, decimal, line, number, of_total
from app.views.closed import ClosedView, StratumView
from app.views.open import OpenView

QUESTION = "How much do we know?"
DAYS_PER_YEAR = 365.25
EPOCH = date(1970, 1, 1).toordinal()
LOW_VARIANCE_RATIO = 0.9


def information_sheet(view: ClosedView, planned: float | None) -> Sheet:
    look = view.look
    information = look.information
    return Sheet(
        key="information",
        number=2,
        name="Information",
        question=QUESTION,
        answer=(
            information_sentence(
                information.events,
                information.planned_events,
                information.fraction,
                planned,
                by=counted_by(view),
            ),
        ),
        figure=calendar_figure(look.calendar, information.planned_events, look.cutoff_day),
        tables=(_arms_table(view), _variance_table(view), *_hypotheses_table(view)),
        folded=_strata_table(view),
        notes=_notes(view),
        methods=methods(information_method(view), "variance-ratio", "person-time", "follow-up"),
        figure_table=calendar_table(look.calendar),
    )


def open_information_sheet(view: OpenView, planned: float | None) -> Sheet:
    look = view.look
    return Sheet(
        key="information",
        number=2,
        name="Information",
        question=QUESTION,
        answer=(information_sentence(look.events, look.planned_events, look.fraction, planned, by=view.by),),
        figure=calendar_figure(look.calendar, look.planned_events, look.cutoff_day),
        tables=(_pooled_table(view),),
        folded=_pooled_strata_table(view),
        methods=methods("information", "person-time", "follow-up"),
        figure_table=calendar_table(look.calendar),
    )


def information_sentence(
    events: int, total: int, fraction: float, planned: float | None, *, by: CountedBy = ""
) -> Line:
    """ "384 of 538 planned events: information fraction 0.714, planned 0.75." """
    against = line(", planned ", plan_fraction(planned)) if planned is not None else ()
    unit = f" by {by}" if by else ""
    said = line(" planned events: information fraction ", number(fraction, 3), unit)
    return line(of_total(events, total), said, against, ".")


def counted_by(view: ClosedView) -> CountedBy:
    """Said where the plan counts information in score variance; the open side always counts events."""
    return "score variance" if view.plan.design.information == "score variance" else ""


def information_method(view: ClosedView) -> str:
    """The name of how the fraction is counted, for what was computed on a sheet."""
    return "information by variance" if counted_by(view) else "information"


def plan_fraction(value: float) -> Span:
    """A fraction as the plan writes it: at least two decimals, no more than it has."""
    text = f"{value:.3f}".rstrip("0")
    whole, _, digits = text.partition(".")
    return Span(f"{whole}.{digits.ljust(2, '0')}" if value < 1 else "1")


def follow_up_sentence(view: ClosedView) -> Line:
    """ "Median follow-up 21.8 months on tablet, 21.3 on placebo." """
    unit, scale = display_unit(view.look.time_unit)
    parts = []
    for index, arm in enumerate(view.arms):
        label = label_of(view, arm)
        said = line(in_unit(arm.counts.follow_up_median, scale), f"{NO_BREAK}{unit}" if index == 0 else "")
        parts.append(line(said, f" {preposition(label)}{NO_BREAK}{label.in_sentence}"))
    return line("Median follow-up ", parts[0], ", ", parts[1], ".")


# --- the figure -----------------------------------------------------------------------------------------


def calendar_figure(
    calendar: CalendarCounts | None, planned_events: int, cutoff: int | None
) -> CalendarFigure | None:
    """Subjects randomised and events by calendar date; None when the extract carries no dates."""
    if calendar is None:
        return None
    days = tuple(calendar.day.tolist())
    return CalendarFigure(
        title="Subjects randomised and events, by calendar date",
        description="Cumulative numbers of subjects randomised and of events, both arms together.",
        y_title="Subjects or events, both arms",
        series=(
            Series("Randomised", days, tuple(calendar.randomised.tolist())),
            Series("Events", days, tuple(calendar.events.tolist())),
        ),
        marks=() if cutoff is None else ((cutoff, day_text(date.fromordinal(EPOCH + cutoff))),),
        planned=(float(planned_events), f"{planned_events} planned"),
    )


def calendar_table(calendar: CalendarCounts | None) -> Table | None:
    """The figure in numbers: the last day of each half-year that the extract reaches."""
    if calendar is None:
        return None
    days = calendar.day.astype("datetime64[D]")
    halves = days.astype("datetime64[M]").astype(int) // 6
    last = [
        index for index in range(days.size) if index + 1 == days.size or halves[index + 1] != halves[index]
    ]
    rows = tuple(
        Row(
            line(str(days[index])),
            (Cell((count(int(calendar.randomised[index])),)), Cell((count(int(calendar.events[index])),))),
        )
        for index in last
    )
    columns = (Column(line("randomised")), Column(line("events")))
    return Table(line("Subjects randomised and events so far, by half-year"), columns, rows, line("Up to"))


# --- the tables -----------------------------------------------------------------------------------------


def person_time(value: float, unit: TimeUnit) -> Span:
    """Person-time in years when times are days, else in the unit given."""
    shown = value / DAYS_PER_YEAR if unit == "days" else value
    return Span(decimal(shown, 1), value=value)


def person_time_name(unit: TimeUnit) -> str:
    names = {
        "days": "Person-years",
        "weeks": "Person-weeks",
        "months": "Person-months",
        "years": "Person-years",
    }
    return names.get(unit, "Person-time")


def _arms_table(view: ClosedView) -> Table:
    unit, scale = display_unit(view.look.time_unit)
    arms = [arm.counts for arm in view.arms]
    labels = [label_of(view, arm) for arm in view.arms]
    return Table(
        caption=line("By arm"),
        columns=tuple(Column(line(label.name), arm=label) for label in labels),
        rows=(
            Row(line("Events of subjects"), tuple(Cell(of_total(arm.events, arm.subjects)) for arm in arms)),
            Row(
                line(person_time_name(view.look.time_unit)),
                tuple(Cell((person_time(arm.person_time, view.look.time_unit),)) for arm in arms),
            ),
            Row(
                line(f"Follow-up, {unit}"),
                tuple(Cell((in_unit(arm.follow_up_median, scale),)) for arm in arms),
            ),
        ),
    )


def _variance_table(view: ClosedView) -> Table:
    information = view.look.information
    rows = [
        Row(*_variance(view)),
        Row(line("over events × shares"), (Cell((_ratio(information.variance_ratio),)),), indent=True),
    ]
    planned = view.plan.enrolment.planned_subjects
    if planned is not None:
        rows.insert(0, Row(line("Subjects of planned"), (Cell(of_total(information.subjects, planned)),)))
    return Table(line("Both arms"), (Column(()),), tuple(rows))


def _variance(view: ClosedView) -> tuple[Line, tuple[Cell, ...]]:
    """The log-rank variance, beside the plan's where that is what information is counted in."""
    observed = number(view.look.information.score_variance, 2)
    planned = view.plan.design.planned_score_variance
    if planned is None:
        return line("Log-rank variance"), (Cell((observed,)),)
    return line("Log-rank variance of planned"), (Cell(line(observed, f" of {decimal(planned, 2)}")),)


def _hypotheses_table(view: ClosedView) -> tuple[Table, ...]:
    """How much is known of each further hypothesis, by its own planned events."""
    if not view.hypotheses:
        return ()
    counted = ((each.hypothesis.name, each.view.look.information) for each in view.hypotheses)
    rows = (
        Row(
            line(name),
            (Cell(of_total(known.events, known.planned_events)), Cell((number(known.fraction, 3),))),
        )
        for name, known in counted
    )
    columns = (Column(line("events of planned")), Column(line("fraction")))
    return (Table(line("Further hypotheses"), columns, tuple(rows)),)


def _ratio(value: Estimate) -> Span:
    shown = number(value, 3)
    low = not isinstance(value, Absent) and value < LOW_VARIANCE_RATIO
    return Span(f"{shown.text}, doubt", "doubt", shown.value) if low else shown


def _strata_table(view: ClosedView) -> tuple[Table, ...]:
    if not view.plan.columns.strata:
        return ()
    labels = [label_of(view, arm) for arm in view.arms]
    columns = (*(Column(line(label.name), arm=label) for label in labels), Column(line("Both arms")))
    rows = tuple(_stratum_row(stratum) for stratum in view.strata)
    return (Table(line("Events of subjects, by stratum"), columns, rows, line("Stratum")),)


def _stratum_row(stratum: StratumView) -> Row:
    cells = [Cell(of_total(events, subjects)) for subjects, events in stratum.arms]
    return Row(line(stratum.label), (*cells, Cell(of_total(stratum.events, stratum.subjects))))


def _pooled_table(view: OpenView) -> Table:
    look = view.look
    unit, scale = display_unit(look.time_unit)
    rows = [
        Row(line("Events of subjects"), (Cell(of_total(look.events, look.subjects)),)),
        Row(
            line(person_time_name(look.time_unit)), (Cell((person_time(look.person_time, look.time_unit),)),)
        ),
        Row(line(f"Follow-up, {unit}"), (Cell((in_unit(look.follow_up_median, scale),)),)),
    ]
    if view.planned_subjects is not None:
        rows.insert(
            0, Row(line("Subjects of planned"), (Cell(of_total(look.subjects, view.planned_subjects)),))
        )
    return Table(line("Both arms"), (Column(()),), tuple(rows))


def _pooled_strata_table(view: OpenView) -> tuple[Table, ...]:
    if len(view.look.strata) < 2:
        return ()
    rows = tuple(
        Row(line(label), (Cell(of_total(events, subjects)),)) for label, subjects, events in view.look.strata
    )
    return (
        Table(line("Events of subjects, by stratum"), (Column(line("Both arms")),), rows, line("Stratum")),
    )


def _notes(view: ClosedView) -> tuple[Line, ...]:
    information = view.look.information
    notes = [line("Follow-up: median, reverse Kaplan-Meier.")]
    if not isinstance(information.variance_ratio, Absent) and information.variance_ratio < LOW_VARIANCE_RATIO:
        low = f"Doubt: the log-rank variance is less than {LOW_VARIANCE_RATIO} of events × shares"
        notes.append(line(f"{low}, so events overstate the information."))
    if view.masked and view.plan.arms.unequal:
        notes.append(line(unequal_words(view)))
    return tuple(notes)


def unequal_words(view: ClosedView) -> str:
    control, experimental = view.plan.arms.allocation
    return (
        f"The plan allocates {control}:{experimental} (control : experimental): "
        "the numbers of subjects identify the letters."
    )
