"""log(-log S) against log time, a step line for each arm."""

from __future__ import annotations

from dataclasses import dataclass

from app.render.palette import PAPER, arm_ink
from app.render.svg.drawing import NARROW, WIDE, Drawing, axis_line, horizontal, small_print, ticks_below
from app.render.svg.element import Element, element
from app.render.svg.geometry import Box, Scale, apart_within, step_path, thinned
from app.render.svg.lettering import SMALL, broken, shortened, text_width, words
from app.sheets.blocks import LogLogFigure, LogLogLine

FINEST = 0.25
LABEL_GAP = 16.0
BASELINE = 4.5
MARGIN = 0.03  # of the axis, left and right of the first and last step


@dataclass(frozen=True)
class Page:
    """Where things stand on the wide and on the narrow drawing."""

    width: float
    plot: Box
    height: float
    numbers_end: float
    short_names: bool


WIDE_PAGE = Page(WIDE, Box(176, 26.5, 648, 346.5), 372, 167, False)
NARROW_PAGE = Page(NARROW, Box(40, 26.5, 327, 246.5), 290, 31, True)


def wide(figure: LogLogFigure) -> Drawing:
    return _drawn(figure, WIDE_PAGE)


def narrow(figure: LogLogFigure) -> Drawing:
    return _drawn(figure, NARROW_PAGE)


def _drawn(figure: LogLogFigure, page: Page) -> Drawing:
    x, y = scales(figure, page)
    return Drawing(
        page.width,
        page.height,
        figure.title,
        figure.description,
        (
            *(horizontal(y(at), page.plot.left, page.plot.right) for at, _ in figure.y_ticks),
            *(small_print(text, page.numbers_end, y(at) + 4, "end") for at, text in figure.y_ticks),
            *(stroke for line in figure.lines for stroke in _line(line, x, y)),
            *_time_axis(figure, page, x),
            *(small_print(*title) for title in titles(figure, page)),
            *(
                words(text, left, baseline, fill=arm_ink(line.arm).text, semibold=True)
                for line, text, left, baseline in names_at(figure, page)
            ),
        ),
    )


def scales(figure: LogLogFigure, page: Page) -> tuple[Scale, Scale]:
    places = [place for line in figure.lines for place in line.log_time]
    heights = [height for line in figure.lines for height in line.log_minus_log]
    low, high = min(*places, figure.x_ticks[0][0]), max(*places, figure.x_ticks[-1][0])
    room = MARGIN * (high - low)
    bottom = min([*heights, figure.y_ticks[0][0]])
    top = max([*heights, figure.y_ticks[-1][0]])
    return (
        Scale(low - room, high + room, page.plot.left, page.plot.right),
        Scale(bottom, top, page.plot.bottom, page.plot.top),
    )


def titles(figure: LogLogFigure, page: Page) -> tuple[tuple[str, float, float], ...]:
    """The titles of the axes: words, left and baseline."""
    left = max(0.0, page.numbers_end - text_width("100", SMALL))
    below = page.plot.bottom + (38 if page.short_names else 20)
    return (
        (shortened(figure.y_title, page.width - left, size=SMALL), left, 14.0),
        (shortened(figure.x_title, page.plot.left + 120, size=SMALL), 0.0, below),
    )


def _time_axis(figure: LogLogFigure, page: Page, x: Scale) -> tuple[Element, ...]:
    shown = ticks_apart(figure, x)
    return (
        axis_line(page.plot.bottom, page.plot.left, page.plot.right),
        ticks_below(page.plot.bottom, [x(at) for at, _ in shown]),
        *(small_print(text, x(at), page.plot.bottom + 20, "middle") for at, text in shown),
    )


def ticks_apart(figure: LogLogFigure, x: Scale) -> list[tuple[float, str]]:
    """Ticks from the last to the first whose numbers do not touch."""
    shown: list[tuple[float, str]] = []
    for at, text in reversed(figure.x_ticks):
        if not shown or x(shown[-1][0]) - x(at) > text_width(text, SMALL) + 12:
            shown.append((at, text))
    return shown[::-1]


def _line(line: LogLogLine, x: Scale, y: Scale) -> tuple[Element, ...]:
    """A solid line; arm B hollow, a wide stroke with a paper core."""
    ink = arm_ink(line.arm)
    places = zip(line.log_time, line.log_minus_log, strict=True)
    path = step_path(thinned([(x(at), y(height)) for at, height in places], FINEST))
    strokes = [(ink.line, 3.25), (PAPER, 1.25)] if ink.hollow else [(ink.line, 1.75)]
    return tuple(
        element("path", d=path, fill="none", stroke=colour, stroke_width=width) for colour, width in strokes
    )


def names_at(figure: LogLogFigure, page: Page) -> tuple[tuple[LogLogLine, str, float, float], ...]:
    """Each line of each arm's name beside the end of its curve: words, left and baseline."""
    _, y = scales(figure, page)
    left = page.plot.right + (5 if page.short_names else 10)
    texts = [_name(line, page) for line in figure.lines]
    ends = [y(line.log_minus_log[-1]) for line in figure.lines]
    gap = LABEL_GAP * max(len(text) for text in texts)
    middles = apart_within(ends, gap, page.plot.top, page.plot.bottom)
    return tuple(
        (line, text, left, middle + BASELINE - LABEL_GAP * (len(lines) - 1) / 2 + LABEL_GAP * row)
        for line, lines, middle in zip(figure.lines, texts, middles, strict=True)
        for row, text in enumerate(lines)
    )


def _name(line: LogLogLine, page: Page) -> tuple[str, ...]:
    if page.short_names:
        return (line.arm.letter,)
    return broken(line.arm.name, page.width - page.plot.right - 10, most_lines=2, semibold=True)
