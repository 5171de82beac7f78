"""The blocks a sheet is set from. They say what is shown, never how it is drawn.

Every number that comes from a look is a Span with its `value`, so that "what is shown is in the record"
can be tested; its `text` is the one rendering of it, used by page, report and table alike.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from typing import Literal

from app.model.boundary import Crossed
from app.model.extract import LookKind

Tone = Literal["plain", "symbol", "strong", "quiet", "crossed", "doubt"]
Letter = Literal["A", "B"]


@dataclass(frozen=True)
class Span:
    """A run of text. `symbol` is set in serif italic (z, p, O, E, V, t); `crossed` and `doubt` carry colour.

    `value` is the record's number behind the text, when there is one.
    """

    text: str
    tone: Tone = "plain"
    value: float | None = None
    href: str | None = None


Line = tuple[Span, ...]


@dataclass(frozen=True)
class ArmLabel:
    """An arm as it may be named on this view. `letter` decides ink and line style, also after unmasking.

    `name` stands alone ("Arm A", "Tablet (B)"); `in_sentence` follows "on" ("arm A", "tablet").
    """

    letter: Letter
    name: str
    in_sentence: str


@dataclass(frozen=True)
class Cell:
    """One table cell: its line, and what stands small under it (an interval under its estimate)."""

    line: Line
    below: Line = ()


@dataclass(frozen=True)
class Column:
    head: Line
    kind: Literal["words", "numbers"] = "numbers"
    arm: ArmLabel | None = None


@dataclass(frozen=True)
class Row:
    """`apart` sets a row off from those above it by a hairline."""

    head: Line
    cells: tuple[Cell, ...]
    indent: bool = False
    apart: bool = False


@dataclass(frozen=True)
class Table:
    """`columns` excludes the row-head column, whose head is `corner`; without head texts no head is set.

    Behind a fold a table without a corner goes by the first span of its caption.
    """

    caption: Line
    columns: tuple[Column, ...]
    rows: tuple[Row, ...]
    corner: Line = ()
    note: Line = ()

    @property
    def has_head(self) -> bool:
        return any(column.head for column in self.columns)


@dataclass(frozen=True)
class AtRiskRow:
    """Counts at each tick of the axis: at risk just before it, events and censored before it."""

    at_risk: tuple[int, ...]
    events: tuple[int, ...]
    censored: tuple[int, ...]


@dataclass(frozen=True)
class CurveLine:
    """One step curve in display units: x in the axis unit, survival and limits in percent (None = no limit).

    `time[0]` is 0 and `survival[0]` is 100. `censored_at` lists (x, survival) of censoring strokes.
    `arm` is None for the pooled curve of the open side (drawn in ink).
    """

    arm: ArmLabel | None
    time: tuple[float, ...]
    survival: tuple[float, ...]
    ci_low: tuple[float | None, ...]
    ci_high: tuple[float | None, ...]
    censored_at: tuple[tuple[float, float], ...]
    rows: AtRiskRow
    label: str
    last: float = math.inf  # the last observation: the curve is not defined after it, and not drawn

    def ends_at(self, axis_end: float) -> float:
        """Where the line ends on an axis that ends there."""
        return min(self.last, axis_end)


@dataclass(frozen=True)
class CurvesFigure:
    """Survival curves, ticks at `ticks` (the last is where the axis ends), rows aligned under them."""

    title: str
    description: str
    x_title: str
    y_title: str
    ticks: tuple[float, ...]
    lines: tuple[CurveLine, ...]
    kind: Literal["curves"] = "curves"


@dataclass(frozen=True)
class Lane:
    """One look as a gauge: z against its bounds, on the axis of information.

    `z` and bounds are oriented as the figure's axis says. `upper` is the bound above which the axis' first
    arm is favoured beyond the efficacy bound; `lower` the mirrored one (two-sided, or masked). None = no
    bound. `mark` is the state of the look's z: crossed looks get a diamond in the crossed colour.
    """

    look: int
    fraction: float
    state: Literal["past", "now", "planned"]
    final: bool
    z: Span | None
    upper: Span | None
    lower: Span | None
    crossed: bool = False
    futility: Span | None = None  # hatched below; mirrored on the right lane of "two lanes"
    harm: Span | None = None  # grey below; mirrored likewise


@dataclass(frozen=True)
class LaneRow:
    """A row of numbers under the lanes; a None cell stays empty."""

    head: Line
    short_head: Line
    cells: tuple[Span | None, ...]
    indent: bool = False
    rule_above: bool = False


@dataclass(frozen=True)
class BoundaryFigure:
    """z by information. `layout` "one lane", or "two lanes" when masked: left as if A were experimental."""

    title: str
    description: str
    y_title: Line
    favours_up: str
    favours_down: str
    lanes: tuple[Lane, ...]
    rows: tuple[LaneRow, ...]
    layout: Literal["one lane", "two lanes"]
    kind: Literal["boundary"] = "boundary"


@dataclass(frozen=True)
class Series:
    """A cumulative step line over calendar days since 1970-01-01."""

    label: str
    day: tuple[int, ...]
    count: tuple[int, ...]
    style: Literal["solid", "dashed"] = "solid"


@dataclass(frozen=True)
class CalendarFigure:
    """Cumulative subjects and events by calendar date; `marks` are (day, label) of data cutoffs."""

    title: str
    description: str
    y_title: str
    series: tuple[Series, ...]
    marks: tuple[tuple[int, str], ...]
    planned: tuple[float, str] | None = None
    kind: Literal["calendar"] = "calendar"


@dataclass(frozen=True)
class LogLogLine:
    """One arm's log(-log S) at its event times: a step line in the figure's units."""

    arm: ArmLabel
    log_time: tuple[float, ...]
    log_minus_log: tuple[float, ...]


@dataclass(frozen=True)
class LogLogFigure:
    """log(-log S) against log time: parallel under proportional hazards. Ticks are (place, words)."""

    title: str
    description: str
    x_title: str
    y_title: str
    x_ticks: tuple[tuple[float, str], ...]
    y_ticks: tuple[tuple[float, str], ...]
    lines: tuple[LogLogLine, ...]
    kind: Literal["log-log"] = "log-log"


@dataclass(frozen=True)
class SmoothPoint:
    """A place of a smooth line: time in the figure's units, the log hazard ratio and its limits."""

    time: float
    log_ratio: float
    low: float
    high: float


@dataclass(frozen=True)
class ResidualFigure:
    """Each event's estimate of the log hazard ratio, the smooth through them, and one ratio for all times.

    `points` are (time, log ratio), events of either arm alike. Ticks are (place, words); up is a larger
    ratio.
    """

    title: str
    description: str
    x_title: str
    y_title: str
    x_ticks: tuple[tuple[float, str], ...]
    y_ticks: tuple[tuple[float, str], ...]
    points: tuple[tuple[float, float], ...]
    smooth: tuple[SmoothPoint, ...]
    constant: float
    constant_words: Span
    favours_up: str
    favours_down: str
    kind: Literal["residuals"] = "residuals"


@dataclass(frozen=True)
class CountsFigure:
    """A row of counts, each with the words under it."""

    title: str
    description: str
    counts: tuple[tuple[Span, str], ...]
    kind: Literal["counts"] = "counts"


@dataclass(frozen=True)
class Chance:
    """A probability in percent under one effect: `low` and `high` where that effect has limits of its own.

    `reading` is "if A" or "if B" while masked, else empty.
    """

    effect: str
    reading: str
    percent: Span
    low: Span | None = None
    high: Span | None = None


@dataclass(frozen=True)
class ChancesFigure:
    """Probabilities as strips over one scale of 0 to 100 percent; those of one effect stand together."""

    title: str
    description: str
    unit: str
    short_unit: str
    chances: tuple[Chance, ...]
    kind: Literal["chances"] = "chances"


@dataclass(frozen=True)
class InformationStrip:
    """The spine lying down, 0 to 1: looks held (fraction, events; the last is now), planned ones below."""

    title: str
    description: str
    held: tuple[tuple[float, Span], ...]
    planned: tuple[float, ...]
    total: Span
    kind: Literal["information strip"] = "information strip"


@dataclass(frozen=True)
class IntervalMark:
    arm: ArmLabel | None
    estimate: float
    low: float | None
    high: float | None


@dataclass(frozen=True)
class IntervalStrip:
    """Estimates with intervals, one line each, over a shared scale with `ticks`."""

    title: str
    description: str
    unit: str
    ticks: tuple[float, ...]
    marks: tuple[IntervalMark, ...]
    kind: Literal["interval strip"] = "interval strip"


@dataclass(frozen=True)
class ZStrip:
    """The gauge of one look lying down: z above, bounds below; `masked`, A's reading over B's."""

    title: str
    description: str
    z: Span | None
    upper: Span | None
    lower: Span | None
    crossed: bool
    futility: Span | None = None
    harm: Span | None = None
    masked: bool = False
    kind: Literal["z strip"] = "z strip"


Figure = (
    CurvesFigure
    | BoundaryFigure
    | CalendarFigure
    | LogLogFigure
    | ResidualFigure
    | CountsFigure
    | ChancesFigure
)
Strip = CountsFigure | InformationStrip | IntervalStrip | ZStrip


@dataclass(frozen=True)
class GlanceRow:
    """One of the five lines of At a glance: sheet number and name, the sentence, a small figure."""

    number: int
    name: str
    sheet: str
    sentence: Line
    strip: Strip | None


@dataclass(frozen=True)
class MethodLine:
    """One entry of "How this was computed": a term and its text."""

    term: str
    text: Line


@dataclass(frozen=True)
class ActLink:
    """Something a person can do from here: its words and its path below the side's base ("receive")."""

    text: str
    path: str


@dataclass(frozen=True)
class Sheet:
    """One question, answered. `number` is None for At a glance; `answer` has two lines for two readings.

    `tables` stand beside the figure, `wide_tables` under it, `folded` ones behind a fold on a page and open
    in print; `figure_table` says the figure in numbers. A `second_figure` stands beside the first, both half
    as wide.
    """

    key: str
    number: int | None
    name: str
    question: str
    answer: tuple[Line, ...]
    figure: Figure | None = None
    glance: tuple[GlanceRow, ...] = ()
    tables: tuple[Table, ...] = ()
    wide_tables: tuple[Table, ...] = ()
    folded: tuple[Table, ...] = ()
    notes: tuple[Line, ...] = ()
    methods: tuple[MethodLine, ...] = ()
    figure_table: Table | None = None
    second_figure: Figure | None = None
    second_figure_table: Table | None = None
    acts: tuple[ActLink, ...] = ()

    @property
    def figures(self) -> tuple[Figure, ...]:
        return tuple(figure for figure in (self.figure, self.second_figure) if figure)

    @property
    def figure_tables(self) -> tuple[Table, ...]:
        return tuple(table for table in (self.figure_table, self.second_figure_table) if table)


CountedBy = Literal["", "events", "score variance"]
"""How information is counted, to be said where a plan counts it in score variance."""


@dataclass(frozen=True)
class SpineLook:
    """One look on the spine; `planned` is the plan's fraction bound to it.

    A look held before this file has no sheets here; `source` is where the plan says its numbers are from.
    """

    number: int
    fraction: float
    events: int
    kind: LookKind
    state: Literal["held before", "frozen", "open", "planned"]
    shown: bool = False
    planned: float | None = None
    crossed: Crossed = "none"
    source: str = ""


@dataclass(frozen=True)
class Spine:
    """The axis of looks. `by` says how information is counted where that is not taken for granted."""

    looks: tuple[SpineLook, ...]
    planned: tuple[float, ...]
    planned_events: int
    by: CountedBy = ""


@dataclass(frozen=True)
class DateMark:
    """One of the three dates: its name, how it is read on a page ("8 Jan 2027", or words), its ISO form."""

    name: str
    text: str
    iso: str | None
    days_since_previous: int | None = None


@dataclass(frozen=True)
class PageFrame:
    """What stands around every sheet of one look and is identical on all of them."""

    side: Literal["closed", "open"]
    disclosure: Literal["masked", "unmasked", "pooled"]
    trial_name: str
    trial_title: str
    dates: tuple[DateMark, ...]
    spine: Spine
    look: int
    colophon: tuple[str, ...]
    sheets: tuple[tuple[str, int | None, str], ...] = field(default=())  # key, number, name


@dataclass(frozen=True)
class LookBook:
    """All sheets of one look with their frame."""

    frame: PageFrame
    sheets: tuple[Sheet, ...]

    def sheet(self, key: str) -> Sheet | None:
        return next((sheet for sheet in self.sheets if sheet.key == key), None)
