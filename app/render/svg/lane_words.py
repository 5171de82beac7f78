"""Words and numbers of the lanes: what stands beside them, and the rows under them."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

from app.render.palette import CROSSED, INK, INK_2
from app.render.svg.drawing import ground, rule, ticks_below
from app.render.svg.element import Element
from app.render.svg.geometry import apart_within
from app.render.svg.lane_plot import (
    FIRST_ROW,
    ROW_PITCH,
    RULE_ROOM,
    UNDER_ROWS,
    LanePlot,
    lower_bound,
    number,
)
from app.render.svg.lettering import LABEL, SMALL, Anchor, line_width, point_offset, text_width, words
from app.sheets.blocks import Lane, LaneRow, Line, Span

LABEL_GAP = 16.0
BASELINE = 4.5  # from the middle of a line of labels down to its baseline
POINT_AT = -7.0  # decimal points stand here from the lane's middle
UNITS_AT = 10.0  # and the last digit of a whole number ends here
NAMES_APART = 56.0
INDENT = 14.0


# --- beside the lanes ---------------------------------------------------------------------------------------


@dataclass(frozen=True)
class Label:
    """Words beside a lane at height `y`, and the bare number for when there is no room."""

    y: float
    full: Line
    short: Line
    fill: str = INK
    semibold: bool = False


def lane_labels(plot: LanePlot, lane: Lane) -> tuple[Element, ...]:
    """The numbers of the look shown, and what the next one needs, at the right of what they name."""
    start = labels_start(plot, lane)
    return tuple(
        part
        for label, line, middle in placed_labels(plot, lane)
        for part in _set_label(label, line, start, middle + BASELINE)
    )


def labels_start(plot: LanePlot, lane: Lane) -> float:
    return plot.right_of(lane) + 7


def placed_labels(plot: LanePlot, lane: Lane) -> list[tuple[Label, Line, float]]:
    """Each label that has room, its words, and the height of their middle once they are kept apart."""
    room = _free_until(plot, lane) - labels_start(plot, lane)
    fitting = [(label, _fitting(label, room)) for label in _labels(plot, lane)]
    shown = [(label, line) for label, line in fitting if line]
    placed = apart_within([label.y for label, _ in shown], LABEL_GAP, plot.area.top + 4, plot.area.bottom - 4)
    return [(label, line, middle) for (label, line), middle in zip(shown, placed, strict=True)]


def _set_label(label: Label, line: Line, left: float, baseline: float) -> tuple[Element, Element]:
    width = line_width(line, LABEL, semibold=label.semibold)
    return ground(left, baseline, width), words(
        line, left, baseline, fill=label.fill, semibold=label.semibold
    )


def _free_until(plot: LanePlot, lane: Lane) -> float:
    """Where the next lane begins, or the edge of the drawing."""
    after = [plot.middle(other) for other in plot.figure.lanes if other.fraction > lane.fraction]
    return min(after) - plot.lane_width / 2 if after else plot.page.width + 8


def _fitting(label: Label, room: float) -> Line:
    """All the words when they and 8 units fit, the number alone when that does, else nothing."""
    for line in (label.full, label.short):
        if line_width(line, LABEL, semibold=label.semibold) + 8 <= room:
            return line
    return ()


def _labels(plot: LanePlot, lane: Lane) -> list[Label]:
    if lane.state == "now":
        return _labels_now(plot, lane)
    planned = [other for other in plot.figure.lanes if other.state == "planned"]
    # masked, each reading needs another number: the rows say both
    if lane not in planned[:1] or plot.is_masked:
        return []
    return _bound_label(plot, "needed", lane.upper, number(lane.upper))


def _labels_now(plot: LanePlot, lane: Lane) -> list[Label]:
    """The bounds with a name each and z between them; two-sided, neither bound is efficacy's."""
    word = "bound" if plot.is_two_sided else "efficacy"
    below = () if plot.is_masked else (("futility", lane.futility), ("harm", lane.harm))
    labels_below = [
        label for name, bound in below for label in _bound_label(plot, name, bound, number(bound))
    ]
    return [
        *_bound_label(plot, word, lane.upper, number(lane.upper)),
        *_z_label(plot, lane),
        *labels_below,
        *_bound_label(plot, word, lane.lower, lower_bound(lane)),
    ]


def _bound_label(plot: LanePlot, word: str, bound: Span | None, z: float | None) -> list[Label]:
    if bound is None or z is None:
        return []
    return [Label(plot.y(z), (Span(f"{word}\u00a0{bound.text}"),), (Span(bound.text),))]


def _z_label(plot: LanePlot, lane: Lane) -> list[Label]:
    z = number(lane.z)
    if z is None or lane.z is None:
        return []
    said = (Span("z", "symbol"), Span(f"\u00a0{lane.z.text}"))
    if not lane.crossed or plot.is_masked:
        return [Label(plot.y(z), said, said, semibold=True)]
    return [Label(plot.y(z), (*said, Span(", crossed")), said, CROSSED, semibold=True)]


# --- under the lanes ----------------------------------------------------------------------------------------


def looks_by_number(plot: LanePlot) -> bool:
    """Where lanes are close, numbers alone stand under them, and the word at the left."""
    return plot.page.short or plot.pitch < NAMES_APART


def look_name(plot: LanePlot, lane: Lane) -> str:
    return str(lane.look) if looks_by_number(plot) else f"Look\u00a0{lane.look}"


def look_names(plot: LanePlot) -> tuple[Element, ...]:
    """ "Look 3" under each lane."""
    by_number = looks_by_number(plot)
    middles = [plot.middle(lane) for lane in plot.figure.lanes]
    first = text_width("Look") + 12 if by_number else 0.0
    placed = apart_within(middles, LABEL_GAP if by_number else 48, first, plot.page.width - 7)
    names = (_look_name(plot, lane, x) for lane, x in zip(plot.figure.lanes, placed, strict=True))
    head = (words("Look", 0, plot.area.bottom + 20, fill=INK_2),) if by_number else ()
    return (ticks_below(plot.area.bottom, middles), *head, *names)


def _look_name(plot: LanePlot, lane: Lane, x: float) -> Element:
    is_now = lane.state == "now"
    return words(
        look_name(plot, lane),
        x,
        plot.area.bottom + 20,
        size=LABEL if looks_by_number(plot) else SMALL,
        fill=INK if is_now else INK_2,
        anchor="middle",
        semibold=is_now,
    )


@dataclass(frozen=True)
class PlacedRow:
    """A row that has room, with the words for its page, on its baseline."""

    row: LaneRow
    head: Line
    y: float


def placed_rows(plot: LanePlot) -> tuple[PlacedRow, ...]:
    """The rows that have room; a rule above one is drawn 20 over its baseline and takes 9 more."""
    placed: list[PlacedRow] = []
    y = plot.area.bottom + FIRST_ROW - ROW_PITCH
    for row in plot.figure.rows:
        head = row.short_head if plot.page.short else row.head
        if head and _has_room(plot, row, head):
            y += ROW_PITCH + (RULE_ROOM if row.rule_above else 0)
            placed.append(PlacedRow(row, head, y))
    return tuple(placed)


def rows_under(plot: LanePlot) -> tuple[tuple[Element, ...], float]:
    """The numbers under the lanes, decimal points in line, and the height of the drawing that holds them."""
    placed = placed_rows(plot)
    rules = (rule(each.y - 20, 0, plot.page.width) for each in placed if each.row.rule_above)
    rows = (part for each in placed for part in _row(plot, each.row, each.head, each.y))
    last = placed[-1].y if placed else plot.area.bottom + 20
    return (*rules, *rows), last + UNDER_ROWS


def _row(plot: LanePlot, row: LaneRow, head: Line, y: float) -> list[Element]:
    cells = (
        _cell(plot, lane, cell, y)
        for lane, cell in zip(plot.figure.lanes, row.cells, strict=True)
        if cell is not None
    )
    return [words(head, row_indent(plot, row), y, fill=INK_2), *cells]


def row_indent(plot: LanePlot, row: LaneRow) -> float:
    return INDENT if row.indent and not plot.page.short else 0.0


def _cell(plot: LanePlot, lane: Lane, cell: Span, y: float) -> Element:
    """The look shown in ink, the others quieter."""
    place, anchor = _cell_place(plot, lane, cell)
    fill = CROSSED if cell.tone == "crossed" else INK if lane.state == "now" else INK_2
    return words(cell.text, place, y, fill=fill, anchor=anchor, semibold=cell.tone == "strong")


def _cell_place(plot: LanePlot, lane: Lane, cell: Span) -> tuple[float, Anchor]:
    """The point of a decimal, the last digit of a whole number, the middle of a word: each has its place."""
    middle = plot.middle(lane)
    if "." in cell.text:
        return middle + POINT_AT - point_offset(cell.text, semibold=cell.tone == "strong"), "start"
    return (middle + UNITS_AT, "end") if cell.text[-1:].isdigit() else (middle, "middle")


def _has_room(plot: LanePlot, row: LaneRow, head: Line) -> bool:
    """A row whose numbers would touch gives way to the table."""
    reach = [(0.0, line_width(head) + row_indent(plot, row))]
    reach += [
        _reach(plot, lane, cell)
        for lane, cell in zip(plot.figure.lanes, row.cells, strict=True)
        if cell is not None
    ]
    return all(right + 5 <= left for (_, right), (left, _) in pairwise(reach))


def _reach(plot: LanePlot, lane: Lane, cell: Span) -> tuple[float, float]:
    place, anchor = _cell_place(plot, lane, cell)
    width = text_width(cell.text, semibold=cell.tone == "strong")
    left = place - {"start": 0.0, "middle": width / 2, "end": width}[anchor]
    return left, left + width
