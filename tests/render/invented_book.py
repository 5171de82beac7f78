"""An invented trial, Q17, at its third look: the book of sheets that figures, pages and reports are tried on.

The bounds are those of O'Brien-Fleming-type spending at 143, 272, 384 and 538 events; everything else is made
up. Times are exponential from a fixed seed. Three states: not crossed, crossed, and masked.
"""

from __future__ import annotations

import math
from dataclasses import replace
from functools import cache
from typing import Literal

import numpy as np

from app.model.survival import SurvivalCurve
from app.sheets.blocks import (
    ArmLabel,
    AtRiskRow,
    BoundaryFigure,
    CalendarFigure,
    Cell,
    Chance,
    ChancesFigure,
    Column,
    CountsFigure,
    CurveLine,
    CurvesFigure,
    DateMark,
    GlanceRow,
    InformationStrip,
    IntervalMark,
    IntervalStrip,
    Lane,
    LaneRow,
    Line,
    LogLogFigure,
    LogLogLine,
    LookBook,
    MethodLine,
    PageFrame,
    ResidualFigure,
    Row,
    Series,
    Sheet,
    SmoothPoint,
    Span,
    Spine,
    SpineLook,
    Table,
    ZStrip,
)
from app.survival.curve import kaplan_meier

State = Literal["not crossed", "crossed", "masked"]
NB = "\u00a0"
Z = Span("z", "symbol")
TABLET = ArmLabel("B", f"Tablet{NB}(B)", "tablet")
PLACEBO = ArmLabel("A", f"Placebo{NB}(A)", "placebo")
ARM_A = ArmLabel("A", f"Arm{NB}A", f"arm{NB}A")
ARM_B = ArmLabel("B", f"Arm{NB}B", f"arm{NB}B")
MONTH = 30.4375
TICKS = (0, 6, 12, 18, 24, 30)

FRACTIONS = (0.266, 0.506, 0.714, 1.0)
EVENTS = (143, 272, 384, 538)
EFFICACY = (4.193, 2.945, 2.434, 2.005)
RATIOS = ("0.495", "0.699", "0.779", "0.841")
FUTILITY = (-0.770, 0.201, 0.958, None)
SPENT = ("0.0000138", "0.00162", "0.00798", "0.0250")
Z_HELD = (0.504, 1.281, 2.129)


def n(value: float, places: int = 3) -> Span:
    return Span(f"{value:.{places}f}".replace("-", "−"), value=value)


def text(*parts: str | Span | Line) -> Line:
    spans: list[Span] = []
    for part in parts:
        spans.extend([Span(part)] if isinstance(part, str) else [part] if isinstance(part, Span) else part)
    return tuple(spans)


def cell(value: str, below: str = "") -> Cell:
    return Cell(text(value), text(below) if below else ())


def futility_cell(look: int) -> Span:
    """The futility bound of a look counted from 0; a dash at the final one, which has none of its own."""
    bound = FUTILITY[look]
    return Span("–") if bound is None else n(bound)


# --- figures ------------------------------------------------------------------------------------------------


def boundary_figure(state: State) -> BoundaryFigure:
    z = (*Z_HELD[:2], 2.610 if state == "crossed" else 2.129)
    sign = -1 if state == "masked" else 1
    masked = state == "masked"
    states: tuple[Literal["past", "now", "planned"], ...] = ("past", "past", "now", "planned")
    lanes = tuple(
        Lane(
            look=look + 1,
            fraction=FRACTIONS[look],
            state=states[look],
            final=look == 3,
            z=n(sign * z[look]) if look < 3 else None,
            upper=n(EFFICACY[look]),
            lower=n(-EFFICACY[look]) if masked else None,
            crossed=state == "crossed" and look == 2,
            futility=None if look == 3 else futility_cell(look),
        )
        for look in range(4)
    )
    z_cells = (*(n(sign * value) for value in z[:2]), replace(n(sign * z[2]), tone="strong"), None)
    rows = (
        LaneRow(text("Information fraction"), text("Fraction"), tuple(n(f) for f in FRACTIONS)),
        LaneRow(text("Events"), text("Events"), tuple(Span(str(e), value=e) for e in EVENTS)),
        LaneRow(text(Z), text(Z), z_cells, rule_above=True),
        LaneRow(
            text("Efficacy bound" + (", ±" if masked else "")),
            text("Efficacy"),
            tuple(n(b) for b in EFFICACY),
        ),
        *(
            ()
            if masked
            else (LaneRow(text("as a hazard ratio"), text("as HR"), tuple(map(Span, RATIOS)), indent=True),)
        ),
        LaneRow(
            text("Futility bound" + (", mirrored" if masked else "")),
            text("Futility"),
            tuple(futility_cell(look) for look in range(4)),
        ),
        LaneRow(text("Alpha spent, one‑sided"), (), tuple(map(Span, SPENT))),
    )
    return BoundaryFigure(
        title="z against the boundary, by information",
        description="Each look is a gauge at its information fraction. The same numbers stand in the table.",
        y_title=text(Z, ", A against B" if masked else ", tablet against placebo"),
        favours_up="favours A" if masked else "favours tablet",
        favours_down="favours B" if masked else "favours placebo",
        lanes=lanes,
        rows=rows,
        layout="two lanes" if masked else "one lane",
    )


def _sample(seed: int, monthly_hazard: float, size: int = 450) -> tuple[np.ndarray, np.ndarray]:
    draw = np.random.default_rng(seed)
    event_at = np.ceil(draw.exponential(MONTH / monthly_hazard, size))
    end_of_follow_up = np.ceil(draw.uniform(12, 32, size) * MONTH)
    dropped_at = np.ceil(draw.exponential(400 * MONTH, size))
    until = np.minimum(end_of_follow_up, dropped_at)
    return np.minimum(event_at, until), event_at <= until


@cache
def _curve(seed: int, monthly_hazard: float, size: int = 450) -> SurvivalCurve:
    time, event = _sample(seed, monthly_hazard, size)
    return kaplan_meier(time, event)


def curve_line(arm: ArmLabel | None, curve: SurvivalCurve, label: str, size: int = 450) -> CurveLine:
    end = TICKS[-1] * MONTH
    steps = (curve.time <= end) & (curve.events > 0)
    strokes = (curve.time <= end) & (curve.censored > 0)

    def limits(values: np.ndarray) -> tuple[float | None, ...]:
        return (None, *(None if math.isnan(v) else 100 * float(v) for v in values[steps]))

    before = np.searchsorted(curve.time, np.array(TICKS) * MONTH)
    events = np.concatenate([[0], np.cumsum(curve.events)])[before]
    censored = np.concatenate([[0], np.cumsum(curve.censored)])[before]
    at_risk = size - events - censored
    return CurveLine(
        arm=arm,
        time=(0.0, *(float(t) / MONTH for t in curve.time[steps])),
        survival=(100.0, *(100 * float(s) for s in curve.survival[steps])),
        ci_low=limits(curve.ci_low),
        ci_high=limits(curve.ci_high),
        censored_at=tuple(
            (float(t) / MONTH, 100 * float(s))
            for t, s in zip(curve.time[strokes], curve.survival[strokes], strict=True)
        ),
        rows=AtRiskRow(tuple(at_risk.tolist()), tuple(events.tolist()), tuple(censored.tolist())),
        label=label,
    )


def curves_figure(state: State = "not crossed") -> CurvesFigure:
    b, a = _curve(17, 0.0235), _curve(4, 0.0305)
    tablet, placebo = (ARM_B, ARM_A) if state == "masked" else (TABLET, PLACEBO)
    lines = (curve_line(tablet, b, tablet.name), curve_line(placebo, a, placebo.name))
    return CurvesFigure(
        title=f"Event-free survival, {tablet.name} and {placebo.name}",
        description="Kaplan-Meier curves with pointwise intervals and the numbers at risk.",
        x_title="Months since randomisation",
        y_title="Event-free, %",
        ticks=TICKS,
        lines=lines[::-1] if state == "masked" else lines,
    )


def pooled_curves_figure() -> CurvesFigure:
    line = curve_line(None, _curve(7, 0.027, 900), "All subjects", 900)
    return replace(curves_figure(), title="Event-free survival, all subjects", lines=(line,))


def log_log_figure(state: State = "not crossed") -> LogLogFigure:
    labels = (ARM_B, ARM_A) if state == "masked" else (TABLET, PLACEBO)
    lines = []
    for label, rate in zip(labels, (0.0235, 0.0305), strict=True):
        months = [0.05 * 1.09**step for step in range(74)]
        heights = [math.log(rate * month) + 0.1 * math.sin(3 * month) for month in months]
        rising = tuple(max(heights[: index + 1]) for index in range(len(heights)))
        lines.append(LogLogLine(label, tuple(math.log(month) for month in months), rising))
    return LogLogFigure(
        title=f"log(\u2212log) of event-free survival, {labels[0].name} and {labels[1].name}",
        description="Two step lines over months on a log scale; parallel lines mean proportional hazards.",
        x_title="Months, log scale",
        y_title="With the event, %, on the log(\u2212log) scale",
        x_ticks=tuple((math.log(month), f"{month:g}") for month in (0.1, 0.5, 1.0, 3.0, 6.0, 12.0, 24.0)),
        y_ticks=tuple(
            (math.log(-math.log1p(-share)), f"{100 * share:g}")
            for share in (0.001, 0.01, 0.05, 0.2, 0.5, 0.8)
        ),
        lines=tuple(lines),
    )


def residual_figure(state: State = "not crossed", events: int = 384) -> ResidualFigure:
    """Two bands of marks about a ratio that goes from 0.6 to 1, limits wider where fewer are left."""
    of, against = ("arm A", "arm B") if state == "masked" else ("tablet", "placebo")
    draw = np.random.default_rng(11)
    times = np.sort(np.minimum(draw.exponential(12, events), 30.0 * draw.uniform(0.2, 1, events)))
    sides = np.where(draw.uniform(size=events) < 0.45, 2.1, -1.9)
    heights = sides + draw.normal(0, 0.1, events) * (1 + times / 12) - 0.2
    smooth = tuple(
        SmoothPoint(month, -0.5 + month / 60, -0.9 - month / 30, -0.1 + month / 15)
        for month in np.linspace(float(times[0]), float(times[-1]), 40).tolist()
    )
    return ResidualFigure(
        title=f"Hazard ratio over time, {of} against {against}",
        description="A mark for each event, a smooth line with its limits, the one ratio dashed.",
        x_title="Months since randomisation",
        y_title="Hazard ratio, log scale",
        x_ticks=tuple((float(month), f"{month}") for month in range(0, math.ceil(times[-1]), 6)),
        y_ticks=tuple((math.log(ratio), f"{ratio:g}") for ratio in (0.2, 0.5, 1, 2, 5)),
        points=tuple(zip(times.tolist(), heights.tolist(), strict=True)),
        smooth=smooth,
        constant=math.log(0.804),
        constant_words=n(0.804),
        favours_up=f"favours {against}",
        favours_down=f"favours {of}",
    )


def calendar_figure() -> CalendarFigure:
    """Enrolment over 20 months from 1 March 2024, events growing with those at risk."""
    start = 19783
    subject_days = tuple(start + round(600 * (i / 900) ** 0.8) for i in range(900))
    marks = ((20263, 143), (20524, 272), (20826, 384))
    event_days = tuple(
        round(np.interp(i, [0, 143, 272, 384], [start + 60, *(day for day, _ in marks)]))
        for i in range(1, 385)
    )
    return CalendarFigure(
        title="Subjects and events by calendar date",
        description="Cumulative counts from the first subject to the data cutoff, with the cutoff of each "
        "look.",
        y_title="Cumulative number",
        series=(
            Series("Subjects", subject_days, tuple(range(1, 901))),
            Series("Events", event_days, tuple(range(1, 385))),
        ),
        marks=tuple((day, f"Look{NB}{look}") for look, (day, _) in enumerate(marks, start=1)),
        planned=(538.0, "538 planned"),
    )


def counts_figure() -> CountsFigure:
    words = (
        ("112", "new events"),
        ("3", "reversed"),
        ("2", "moved"),
        ("0", "vanished subjects"),
        ("0", "changed arm"),
    )
    return CountsFigure(
        title="What changed since look 2",
        description="112 new events, 3 reversed, 2 moved, no vanished subjects, no changed arm.",
        counts=tuple((Span(number, value=float(number)), said) for number, said in words),
    )


def chances_figure(state: State) -> ChancesFigure:
    """Strips of what going on may bring; masked, both readings of each effect."""

    def percent(value: float) -> Span:
        return Span(f"{100 * value:.1f}", value=value)

    readings = ("if A", "if B") if state == "masked" else ("",)
    effects = (
        ("The plan’s ratio", (0.934, 0.0)),
        ("The trend so far", (0.867, 0.0)),
        ("No effect", (0.39, 1.0)),
    )
    return ChancesFigure(
        title="Conditional power along the planned looks",
        description="93.4 percent under the plan’s ratio, 86.7 under the trend so far, 39.0 under no effect.",
        unit="percent, along the looks",
        short_unit="percent",
        chances=tuple(
            Chance(said, reading, percent(value))
            if "trend" not in said
            else Chance(said, reading, percent(value), percent(value / 2), percent(min(1.0, value + 0.124)))
            for said, values in effects
            for reading, value in zip(readings, values, strict=False)
        ),
    )


def information_strip() -> InformationStrip:
    return InformationStrip(
        title="Information so far",
        description="384 of 538 planned events.",
        held=tuple((f, Span(str(e), value=e)) for f, e in zip(FRACTIONS[:3], EVENTS[:3], strict=True)),
        planned=(0.25, 0.5, 0.75, 1.0),
        total=Span("538 planned", value=538),
    )


def interval_strip() -> IntervalStrip:
    return IntervalStrip(
        title="Event-free at 24 months",
        description="57.5% on tablet, 48.2% on placebo, with 95% intervals.",
        unit="Event-free, %",
        ticks=(0, 25, 50, 75, 100),
        marks=(IntervalMark(TABLET, 57.5, 52.2, 62.4), IntervalMark(PLACEBO, 48.2, 42.4, 53.8)),
    )


def z_strip(state: State) -> ZStrip:
    z = {"not crossed": 2.129, "crossed": 2.610, "masked": -2.129}[state]
    return ZStrip(
        title="z against its bounds",
        description=f"z {z}, efficacy bound 2.434, futility bound 0.958.",
        z=n(z),
        upper=n(2.434),
        lower=n(-2.434) if state == "masked" else None,
        crossed=state == "crossed",
        futility=n(0.958),
        masked=state == "masked",
    )


# --- tables -------------------------------------------------------------------------------------------------


def looks_table() -> Table:
    heads = (
        "Information fraction",
        "Events",
        Z,
        "Efficacy bound",
        "as a hazard ratio",
        "Futility bound",
        "Alpha spent, one‑sided",
    )
    rows = tuple(
        Row(
            text(str(look + 1)),
            tuple(
                cell(value)
                for value in (
                    f"{FRACTIONS[look]:.3f}",
                    str(EVENTS[look]),
                    f"{Z_HELD[look]:.3f}" if look < 3 else "",
                    f"{EFFICACY[look]:.3f}",
                    RATIOS[look],
                    futility_cell(look).text,
                    SPENT[look],
                    ("frozen", "frozen", "open", "planned, final")[look],
                )
            ),
        )
        for look in range(4)
    )
    columns = (*(Column(text(head)) for head in heads), Column(text("State"), "words"))
    return Table(text("The looks and their bounds"), columns, rows, corner=text("Look"))


def observed_table(state: State) -> tuple[Table, ...]:
    if state == "masked":
        crossed = Cell((Span("futility", "crossed"),))
        readings = Table(
            text("Look 3, both readings"),
            (Column(text("if A is experimental")), Column(text("if B is experimental"))),
            (
                Row(text(Z), (cell("−2.129"), cell("2.129"))),
                Row(text("Efficacy bound"), (cell("2.434"), cell("2.434"))),
                Row(text("Futility bound"), (cell("0.958"), cell("0.958"))),
                Row(text("Crossed"), (crossed, cell("none"))),
                Row(text(Span("p", "symbol"), ", one-sided"), (cell("0.9834"), cell("0.0166"))),
            ),
        )
        either = Table(
            text("A against B, whichever is experimental"),
            (Column(()),),
            (
                Row(text(Span("p", "symbol"), ", two-sided"), (cell("0.0332"),)),
                Row(text("Hazard ratio"), (cell("1.243"),)),
                Row(text("95%, not adjusted for looks"), (cell("1.017 to 1.519"),)),
            ),
        )
        return readings, either
    z, p, ratio = ("2.610", "0.0045", "0.765") if state == "crossed" else ("2.129", "0.0166", "0.804")
    first = Table(
        text("Look 3, tablet against placebo"),
        (Column(text("observed")), Column(text("efficacy bound"))),
        (
            Row(text(Z), (cell(z), cell("2.434"))),
            Row(text(Span("p", "symbol"), ", one-sided"), (cell(p), cell("0.0075"))),
            Row(text("Hazard ratio"), (cell(ratio), cell("0.779"))),
        ),
    )
    second = Table(
        text("Hazard ratio, 95% interval"),
        (Column(()),),
        (
            Row(text("not adjusted for looks"), (cell("0.658 to 0.983"),)),
            Row(text("repeated over looks"), (cell("0.627 to 1.032"),)),
        ),
    )
    third = Table(
        text("Log-rank, tablet"),
        (Column(()),),
        (
            Row(text("Observed less expected events"), (cell("−20.80"),)),
            Row(text("Variance"), (cell("95.41"),)),
        ),
    )
    return first, second, third


def estimates_table(state: State) -> Table:
    arms = (ARM_A, ARM_B) if state == "masked" else (TABLET, PLACEBO)
    rows = (
        Row(text("Events of subjects"), (cell("181 of 450"), cell("203 of 450"))),
        Row(text("Median, months"), (cell("29.9", "26.9 to not reached"), cell("23.7", "21.2 to 26.4"))),
        Row(text("Event‑free, %"), (cell(""), cell(""))),
        Row(text("at 12 months"), (cell("75.1", "70.8 to 78.8"), cell("70.5", "66.0 to 74.6")), indent=True),
        Row(text("at 24 months"), (cell("57.5", "52.2 to 62.4"), cell("48.2", "42.4 to 53.8")), indent=True),
        Row(text("Follow-up, months"), (cell("21.8"), cell("21.3"))),
    )
    columns = tuple(Column(text(arm.name), arm=arm) for arm in arms)
    return Table(text("Estimates with 95% intervals"), columns, rows)


def ratio_table() -> Table:
    rows = tuple(
        Row(text(month), (cell(events), cell(ratio, limits)))
        for month, events, ratio, limits in (
            ("0.1", "1", "0.607", "0.407 to 0.905"),
            ("9.8", "240", "0.714", "0.293 to 1.739"),
            ("27.4", "384", "0.958", "0.163 to 5.623"),
        )
    )
    columns = (Column(text("Events so far")), Column(text("Hazard ratio")))
    return Table(text("Smoothed hazard ratio, 95% limits"), columns, rows, corner=text("Months"))


def findings_table() -> Table:
    doubt = (Span("doubt", "doubt"),)
    return Table(
        text("What was found in the extract"),
        (Column(text("Finding"), "words"), Column(text("Rows")), Column(text("Answer"), "words")),
        (
            Row(
                doubt,
                (
                    cell("Time 0 in adtte.csv, column AVAL"),
                    cell("3 of 900"),
                    cell("Randomised and admitted on one day"),
                ),
            ),
            Row(
                doubt,
                (cell("Event reversed since look 2"), cell("3 of 272"), cell("Adjudicated on 11 Jan 2027")),
            ),
            Row(text("note"), (cell("Columns left out: AGE, SEX"), cell("–"), cell(""))),
        ),
        corner=text("Kind"),
        note=text("A doubt does not block; it is answered with a reason before the extract is received."),
    )


# --- sheets -------------------------------------------------------------------------------------------------

METHODS = (
    MethodLine(
        "Statistic",
        text(
            Z,
            " = −(",
            Span("O", "symbol"),
            " − ",
            Span("E", "symbol"),
            ") / √",
            Span("V", "symbol"),
            " = 20.800 / √95.414 = 2.129; log-rank with hypergeometric variance, stratified by "
            "region and prior heart "
            "failure; ",
            Span("O", "symbol"),
            " and ",
            Span("E", "symbol"),
            " of the experimental arm. Positive favours tablet.",
        ),
    ),
    MethodLine(
        "Boundary",
        text(
            "O’Brien-Fleming-type spending, α one-sided 0.025, at the information reached. Looks "
            "1 and 2 as used."
        ),
    ),
    MethodLine(
        "Source", text("Lan and DeMets (1983), Biometrika 70, 659–663; Armitage, McPherson and Rowe (1969).")
    ),
)


def boundary_answer(state: State) -> tuple[Line, ...]:
    crossed = Span("crossed", "crossed")
    if state == "masked":
        return (
            text("If A is experimental: ", Z, f"{NB}−2.129, futility bound 0.958 ", crossed, "."),
            text("If B is experimental: ", Z, f"{NB}2.129, no boundary crossed."),
        )
    if state == "crossed":
        return (text("The efficacy boundary was ", crossed, ": ", Z, f"{NB}2.610 against 2.434."),)
    return (text("The efficacy boundary was not crossed: ", Z, f"{NB}2.129 against 2.434."),)


def glance_sheet(state: State) -> Sheet:
    doubts = Span(f"2{NB}doubts", "doubt", value=2, href="data")
    rows = (
        GlanceRow(
            1,
            "Data",
            "data",
            text(
                "The extract holds 900 subjects and 384 events and can be used; ",
                doubts,
                " stand. Since look 2, 5 earlier events were changed.",
            ),
            counts_figure(),
        ),
        GlanceRow(
            2,
            "Information",
            "information",
            text(
                "384 of 538 planned events: information fraction 0.714, planned 0.75. Median "
                "follow-up 21.8 months on tablet, 21.3 on placebo."
            ),
            information_strip(),
        ),
        GlanceRow(
            3,
            "Curves",
            "curves",
            text(
                "At 24 months 57.5% on tablet and 48.2% on placebo were event‑free. Hazard ratio "
                "0.804 (95% interval 0.658 to 0.983, not adjusted for looks)."
            ),
            interval_strip(),
        ),
        GlanceRow(
            4,
            "Boundary",
            "boundary",
            text(
                "No boundary was crossed: ",
                Z,
                f"{NB}2.129 against 2.434. At look 4 ",
                Z,
                f"{NB}2.005 is needed, a hazard ratio of 0.841 or less.",
            ),
            z_strip(state),
        ),
        GlanceRow(
            9,
            "Record",
            "record",
            text("Looks 1 and 2 are frozen; look 3 is open. Both frozen looks verify."),
            None,
        ),
    )
    return Sheet(
        key="at-a-glance",
        number=None,
        name="At a glance",
        question="What does look 3 show, in five lines?",
        answer=(text("With 384 of 538 planned events, no boundary was crossed."),),
        glance=rows,
        methods=METHODS[1:],
    )


def sheets(state: State) -> tuple[Sheet, ...]:
    note = text(
        "Grey: beyond the efficacy bound. Hatched: beyond the futility bound (non-binding). "
        "Bounds exist at looks only; the dotted line guides the eye. Looks 1 and 2: bounds as "
        "used. Look 4: if held at 538 events."
    )
    curves_note = text(
        "Bands and intervals: log-log, pointwise. Follow-up: median, reverse Kaplan-Meier. "
        "Strokes: censored. Events and censored: before the tick; the three rows add up to "
        "the arm."
    )
    difference = Table(
        text("Difference at 24 months, points"),
        (Column(()),),
        (Row(text("Tablet less placebo"), (cell("9.3", "1.6 to 17.0"),)),),
    )
    arms = Table(
        text("By arm"),
        (Column(text("Subjects")), Column(text("Events")), Column(text("Years"))),
        (
            Row(text("Tablet"), (cell("450"), cell("181"), cell("742.1"))),
            Row(text("Placebo"), (cell("450"), cell("203"), cell("706.4"))),
        ),
    )
    return (
        glance_sheet(state),
        Sheet(
            "data",
            1,
            "Data",
            "Can we trust this extract?",
            (text("The extract can be used; ", Span("2 doubts", "doubt"), " stand."),),
            counts_figure(),
            wide_tables=(findings_table(),),
            tables=(
                Table(
                    text("The extract"),
                    (Column(()),),
                    (Row(text("Subjects"), (cell("900"),)), Row(text("Events"), (cell("384 of 900"),))),
                ),
            ),
            methods=METHODS[2:],
        ),
        Sheet(
            "information",
            2,
            "Information",
            "How much do we know?",
            (text("384 of 538 planned events: information fraction 0.714, planned 0.75."),),
            calendar_figure(),
            tables=(arms,),
            notes=(text("Years: person-time at risk."),),
            methods=METHODS[1:],
            figure_table=looks_table(),
        ),
        Sheet(
            "curves",
            3,
            "Curves",
            "What happened to the patients?",
            (text("At 24 months 57.5% on tablet and 48.2% on placebo were event‑free."),),
            curves_figure(state),
            tables=(estimates_table(state), difference),
            notes=(curves_note,),
            methods=METHODS,
            figure_table=looks_table(),
        ),
        Sheet(
            "boundary",
            4,
            "Boundary",
            "Where does the test stand?",
            boundary_answer(state),
            boundary_figure(state),
            tables=observed_table(state),
            notes=(note,),
            methods=METHODS,
            figure_table=looks_table(),
        ),
        Sheet(
            "shape",
            5,
            "Shape",
            "Does one hazard ratio tell the story?",
            (text("No change of the hazard ratio with time is seen, from 384 events."),),
            log_log_figure(state),
            tables=(difference,),
            notes=(text("Marks are events’ scaled residuals; the smooth is no test."),),
            methods=METHODS[2:],
            figure_table=arms,
            second_figure=residual_figure(state),
            second_figure_table=ratio_table(),
        ),
        Sheet(
            "record",
            9,
            "Record",
            "What was shown, what was advised?",
            (text("Looks 1 and 2 are frozen; look 3 is open."),),
            wide_tables=(looks_table(),),
            methods=METHODS[2:],
        ),
    )


# --- frame --------------------------------------------------------------------------------------------------


def frame(state: State) -> PageFrame:
    spine = Spine(
        looks=(
            SpineLook(1, 0.266, 143, "planned", "frozen", planned=0.25),
            SpineLook(2, 0.506, 272, "planned", "frozen", planned=0.5),
            SpineLook(
                3,
                0.714,
                384,
                "planned",
                "open",
                shown=True,
                planned=0.75,
                crossed="efficacy" if state == "crossed" else "none",
            ),
            SpineLook(4, 1.0, 538, "final", "planned", planned=1.0),
        ),
        planned=(0.25, 0.5, 0.75, 1.0),
        planned_events=538,
    )
    return PageFrame(
        side="closed",
        disclosure="masked" if state == "masked" else "unmasked",
        trial_name="Q17",
        trial_title="An invented trial of tablet against placebo",
        dates=(
            DateMark("Data cutoff", f"8{NB}Jan{NB}2027", "2027-01-08"),
            DateMark("Extract", f"15{NB}Jan{NB}2027", "2027-01-15", 7),
            DateMark("Run", f"26{NB}Jan{NB}2027", "2027-01-26", 11),
        ),
        spine=spine,
        look=3,
        colophon=("Look 3, planned, open", "Plan version 2"),
        sheets=tuple((sheet.key, sheet.number, sheet.name) for sheet in sheets(state)),
    )


def book(state: State = "not crossed") -> LookBook:
    return LookBook(frame(state), sheets(state))
