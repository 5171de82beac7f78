"""log(-log S) against log time, a step line for each arm."""

from __future__ import annotations

from app.render.palette import PAPER, arm_ink
from app.render.svg.drawing import Drawing
from app.render.svg.element import Element, element
from app.render.svg.geometry import Scale, apart_within, step_path, thinned
from app.render.svg.lettering import broken, words
from app.render.svg.panel import HALF_PAGE, NARROW_PAGE, WIDE_PAGE, Page, axes
from app.sheets.blocks import LogLogFigure, LogLogLine

FINEST = 0.25
LABEL_GAP = 16.0
BASELINE = 4.5
NAME_OFF = 8.0  # of a name, from the plot
MARGIN = 0.03  # of the axis, left and right of the first and last step


def wide(figure: LogLogFigure) -> Drawing:
    return _drawn(figure, WIDE_PAGE)


def half(figure: LogLogFigure) -> Drawing:
    return _drawn(figure, HALF_PAGE)


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
            *axes(figure, page, x, y),
            *(stroke for line in figure.lines for stroke in _line(line, x, y)),
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
    left, room = page.plot.right + NAME_OFF, page.beside - NAME_OFF
    most = 2 if page is WIDE_PAGE else 3
    texts = [broken(line.arm.name, room, most_lines=most, semibold=True) for line in figure.lines]
    ends = [y(line.log_minus_log[-1]) for line in figure.lines]
    gap = LABEL_GAP * max(len(text) for text in texts)
    middles = apart_within(ends, gap, page.plot.top + gap / 2, page.plot.bottom)
    return tuple(
        (line, text, left, middle + BASELINE - LABEL_GAP * (len(lines) - 1) / 2 + LABEL_GAP * row)
        for line, lines, middle in zip(figure.lines, texts, middles, strict=True)
        for row, text in enumerate(lines)
    )
