"""Survival curves with the numbers at risk in line under the ticks of the time axis."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import groupby

from app.render.palette import BAND_OPACITY, HAIRLINE, INK, INK_2, PAPER, ArmInk, arm_ink
from app.render.svg.drawing import (
    NARROW,
    WIDE,
    Drawing,
    axis_line,
    horizontal,
    small_print,
    ticks_below,
)
from app.render.svg.element import Element, coordinate, element
from app.render.svg.geometry import Box, Scale, apart_within, step_path, thinned
from app.render.svg.lettering import LABEL, SMALL, broken, shortened, text_width, widest, words
from app.sheets.blocks import CurveLine, CurvesFigure

PERCENT_TICKS = (0.0, 25.0, 50.0, 75.0, 100.0)
STROKE = 3.5  # a censoring stroke, and how far it stands off the line
STROKE_OFF = 3.0
ROW_PITCH = 16.0
ARM_GAP = 9.0
UNITS_AT = 10.0  # digits end here right of their tick, so that units stand in line
FINEST = 0.25
LABEL_GAP = 16.0
BASELINE = 4.5  # from the middle of a line of labels down to its baseline


@dataclass(frozen=True)
class Page:
    """Where things stand on the wide and on the narrow drawing."""

    width: float
    plot: Box
    numbers_end: float  # the percent numbers are right-aligned here
    words_at: float  # where "At risk" begins
    name_above: bool  # the arm's name on a line of its own
    row_words: tuple[str, str, str]


WIDE_PAGE = Page(WIDE, Box(176, 26.5, 648, 276.5), 167, 104, False, ("At risk", "Events", "Censored"))
NARROW_PAGE = Page(NARROW, Box(62, 26.5, 327, 226.5), 53, 0, True, ("At risk", "Events", "Cens."))


def wide(figure: CurvesFigure) -> Drawing:
    return _drawn(figure, WIDE_PAGE)


def narrow(figure: CurvesFigure) -> Drawing:
    return _drawn(figure, NARROW_PAGE)


def _drawn(figure: CurvesFigure, page: Page) -> Drawing:
    x = Scale(figure.ticks[0], figure.ticks[-1], page.plot.left, page.plot.right)
    y = percent_scale(page)
    rows, height = _rows(figure, page, x)
    return Drawing(
        page.width,
        height,
        figure.title,
        figure.description,
        (
            *_percent_axis(figure, page, y),
            *(_band(line, x, y) for line in figure.lines),
            *(stroke for line in figure.lines for stroke in _line(line, x, y)),
            *(_strokes(line, x, y, upwards=is_upper(line, figure.lines)) for line in figure.lines),
            *_time_axis(figure, page, x),
            *_end_labels(figure, page),
            *rows,
        ),
    )


def percent_scale(page: Page) -> Scale:
    """Event-free from 0 to 100 always."""
    return Scale(0, 100, page.plot.bottom, page.plot.top)


# --- axes -----------------------------------------------------------------------------------------------


def _percent_axis(figure: CurvesFigure, page: Page, y: Scale) -> tuple[Element, ...]:
    grid = (
        horizontal(y(tick), page.plot.left, page.plot.right, *([HAIRLINE] if tick == 50 else []))
        for tick in PERCENT_TICKS[1:]
    )
    numbers = (small_print(f"{tick:g}", page.numbers_end, y(tick) + 4, "end") for tick in PERCENT_TICKS)
    return (
        small_print(shortened(figure.y_title, page.width / 2, size=SMALL), y_title_at(page), 14),
        *grid,
        *numbers,
    )


def y_title_at(page: Page) -> float:
    """Over the axis, where its numbers begin."""
    return page.numbers_end - text_width("100", SMALL)


def _time_axis(figure: CurvesFigure, page: Page, x: Scale) -> tuple[Element, ...]:
    below = page.plot.bottom + 20
    shown = shown_ticks(figure, x)
    title_at = below + (18 if page.name_above else 0)
    room = page.width if page.name_above else page.plot.left - 12
    return (
        axis_line(page.plot.bottom, page.plot.left, page.plot.right),
        ticks_below(page.plot.bottom, [x(figure.ticks[index]) for index in shown]),
        *(
            small_print(f"{figure.ticks[index]:g}", x(figure.ticks[index]), below, "middle")
            for index in shown
        ),
        small_print(shortened(figure.x_title, room, size=SMALL), 0, title_at),
    )


def shown_ticks(figure: CurvesFigure, x: Scale) -> tuple[int, ...]:
    """Every tick, or every second, third ... one when their numbers would touch."""
    counts = [str(n) for line in figure.lines for row in _counts(line) for n in row]
    room = widest(counts, LABEL, semibold=True) + 6
    pitch = min(
        (x(b) - x(a) for a, b in zip(figure.ticks, figure.ticks[1:], strict=False)), default=page_span(x)
    )
    every = max(1, -int(-room // pitch))
    return tuple(range(0, len(figure.ticks), every))


def page_span(x: Scale) -> float:
    return x.end - x.start


# --- lines ----------------------------------------------------------------------------------------------


def _line(line: CurveLine, x: Scale, y: Scale) -> tuple[Element, ...]:
    """A solid line; arm B hollow, a wide stroke with a paper core."""
    ink = arm_ink(line.arm)
    path = step_path(_within(line, x, y))
    if not ink.hollow:
        return (_stroke(path, ink.line, 1.75),)
    return (_stroke(path, ink.line, 3.25), _stroke(path, PAPER, 1.25))


def _stroke(path: str, colour: str, width: float) -> Element:
    return element("path", d=path, fill="none", stroke=colour, stroke_width=width)


def _within(line: CurveLine, x: Scale, y: Scale) -> tuple[tuple[float, float], ...]:
    """The step line in units of the drawing, drawn on to the last observation or the end of the axis."""
    inside = [(x(t), y(p)) for t, p in zip(line.time, line.survival, strict=True) if t <= x.high]
    end = x(line.ends_at(x.high))
    if inside[-1][0] < end:
        inside.append((end, inside[-1][1]))
    return thinned(inside, FINEST)


def _band(line: CurveLine, x: Scale, y: Scale) -> Element:
    """The pointwise interval, wherever there is one."""
    paths = (_band_path(run, x, y) for run in runs_with_limits(line, line.ends_at(x.high)))
    ink = arm_ink(line.arm)
    return element("path", d="".join(paths) or "M0 0", fill=ink.line, fill_opacity=BAND_OPACITY)


Limits = tuple[float, float, float]  # time, low, high


def runs_with_limits(line: CurveLine, end: float) -> list[list[Limits]]:
    """Stretches of time over which both limits exist; each ends where the next step begins."""
    until = (*line.time[1:], end)
    steps = zip(line.time, line.ci_low, line.ci_high, until, strict=True)
    runs: list[list[Limits]] = []
    for has_limits, group in groupby(
        (step for step in steps if step[0] <= end),
        key=lambda step: step[1] is not None and step[2] is not None,
    ):
        if has_limits:
            stretch = list(group)
            run = [(t, low, high) for t, low, high, _ in stretch if low is not None and high is not None]
            runs.append([*run, (min(stretch[-1][3], end), *run[-1][1:])])
    return runs


def _band_path(run: Sequence[Limits], x: Scale, y: Scale) -> str:
    """Along the upper limit, and back along the lower one."""
    upper = thinned([(x(t), y(high)) for t, _, high in run], FINEST)
    lower = thinned([(x(t), y(low)) for t, low, _ in run], FINEST)
    back = [f"L{coordinate(lower[-1][0])} {coordinate(lower[-1][1])}"]
    for (x_here, y_here), (_, y_next) in zip(reversed(lower[:-1]), reversed(lower[1:]), strict=True):
        back.append(f"H{coordinate(x_here)}" + (f"V{coordinate(y_here)}" if y_here != y_next else ""))
    return f"{step_path(upper)}{''.join(back)}Z"


def _strokes(line: CurveLine, x: Scale, y: Scale, *, upwards: bool) -> Element:
    """Censorings, off the line on the side away from the other arm."""
    direction, off = (-1, -STROKE_OFF) if upwards else (1, STROKE_OFF)
    places = sorted({(coordinate(x(t)), coordinate(y(p) + off)) for t, p in line.censored_at if t <= x.high})
    down = "".join(f"M{at} {start}v{coordinate(direction * STROKE)}" for at, start in places)
    return element("path", d=down or "M0 0", fill="none", stroke=arm_ink(line.arm).line, stroke_width=0.75)


def is_upper(line: CurveLine, lines: Sequence[CurveLine]) -> bool:
    """Strokes of the arm that is higher where the axis ends go above it, of the lower one below."""
    return line.survival[-1] >= max(other.survival[-1] for other in lines)


# --- labels and rows ------------------------------------------------------------------------------------


def _end_labels(figure: CurvesFigure, page: Page) -> tuple[Element, ...]:
    """The arm's name at the end of its line, in as many lines as it takes."""
    return tuple(
        words(text, label_left(page), baseline + LABEL_GAP * row, fill=arm_ink(line.arm).text, semibold=True)
        for line, baseline in zip(figure.lines, end_labels_at(figure, page), strict=True)
        for row, text in enumerate(name_lines(line, page))
    )


def label_left(page: Page) -> float:
    return page.plot.right + (5 if page.name_above else 10)


def end_labels_at(figure: CurvesFigure, page: Page) -> tuple[float, ...]:
    """The first baseline of each arm's name: beside the end of its line, and apart from the other's."""
    y = percent_scale(page)
    rows = [len(name_lines(line, page)) for line in figure.lines]
    ends = [y(line.survival[-1]) for line in figure.lines]
    placed = apart_within(ends, LABEL_GAP * max([1, *rows]), page.plot.top, page.plot.bottom)
    return tuple(
        middle + BASELINE - LABEL_GAP * (count - 1) / 2 for middle, count in zip(placed, rows, strict=True)
    )


def name_lines(line: CurveLine, page: Page) -> tuple[str, ...]:
    """On a narrow drawing only the letter has room."""
    if page.name_above:
        return (line.arm.letter,) if line.arm else ()
    return broken(line.label, page.width - page.plot.right - 10, most_lines=2, semibold=True)


def _counts(line: CurveLine) -> tuple[tuple[int, ...], ...]:
    return line.rows.at_risk, line.rows.events, line.rows.censored


def row_heights(figure: CurvesFigure, page: Page) -> tuple[float, ...]:
    """The baseline of each arm's first row of numbers."""
    name = ROW_PITCH if page.name_above else 0.0
    first = page.plot.bottom + 44.5 + 2 * name
    return tuple(first + index * (3 * ROW_PITCH + ARM_GAP + name) for index in range(len(figure.lines)))


def _rows(figure: CurvesFigure, page: Page, x: Scale) -> tuple[tuple[Element, ...], float]:
    """Three rows an arm under the ticks, and the height of the drawing that holds them."""
    parts: list[Element] = []
    tops = row_heights(figure, page)
    for line, top in zip(figure.lines, tops, strict=True):
        parts.extend(_arm_name(line, page, top - (ROW_PITCH if page.name_above else 0)))
        for number, (word, counts) in enumerate(zip(page.row_words, _counts(line), strict=True)):
            parts.extend(_row(word, counts, figure, page, x, top + ROW_PITCH * number, strong=number == 0))
    return tuple(parts), tops[-1] + 2 * ROW_PITCH + 4.5


def _arm_name(line: CurveLine, page: Page, y: float) -> tuple[Element, ...]:
    """A sample of the line and the name, broken over the three rows when it is long."""
    ink = arm_ink(line.arm)
    room = page.width - 24 if page.name_above else page.words_at - 28
    lines = broken(line.label, room, most_lines=1 if page.name_above else 3, semibold=True)
    names = (
        words(text, 24, y + ROW_PITCH * row, fill=ink.text, semibold=True) for row, text in enumerate(lines)
    )
    return (*_sample(ink, y - BASELINE), *names)


def _sample(ink: ArmInk, y: float) -> tuple[Element, ...]:
    path = f"M0 {coordinate(y)}H18"
    if not ink.hollow:
        return (_stroke(path, ink.line, 1.75),)
    return (_stroke(path, ink.line, 3.25), _stroke(path, PAPER, 1.25))


def _row(
    word: str, counts: Sequence[int], figure: CurvesFigure, page: Page, x: Scale, y: float, *, strong: bool
) -> tuple[Element, ...]:
    head = words(word, page.words_at, y, fill=INK if strong else INK_2, semibold=strong)
    numbers = (
        words(str(counts[index]), x(figure.ticks[index]) + UNITS_AT, y, anchor="end", semibold=strong)
        for index in shown_ticks(figure, x)
    )
    return (head, *numbers)
