"""z by information: each look is a gauge, a lane at its fraction with the bounds that held there.

Bounds exist at looks and nowhere else, so no line joins them but a dotted guide for the eye. Unmasked, one
lane a look. Masked, two: the left is read as if A were experimental, the right as if B were.
"""

from __future__ import annotations

from app.render.palette import HAIRLINE, INK_2, INK_3
from app.render.svg.drawing import Drawing, axis_line, horizontal, small_print
from app.render.svg.element import Element, coordinate, element
from app.render.svg.gauge import gauge
from app.render.svg.geometry import WHOLE_STEPS, round_ticks
from app.render.svg.lane_plot import (
    NARROW_PAGE,
    WIDE_PAGE,
    LanePage,
    LanePlot,
    lane_plot,
    lower_bound,
    number,
)
from app.render.svg.lane_words import lane_labels, look_names, rows_under
from app.render.svg.lettering import SMALL, line_width, shortened, shortened_line, text_width, words
from app.sheets.blocks import BoundaryFigure, Lane, Line, Span

MOST_TICKS = 7
TOOLS = 124.0  # what a page may set at the right end of the line that the title stands on
BESIDE_NUMBERS = 130.0  # where words left of the numbers end


def wide(figure: BoundaryFigure) -> Drawing:
    return _drawn(figure, WIDE_PAGE)


def narrow(figure: BoundaryFigure) -> Drawing:
    return _drawn(figure, NARROW_PAGE)


def _drawn(figure: BoundaryFigure, page: LanePage) -> Drawing:
    plot = lane_plot(figure, page)
    rows, height = rows_under(plot)
    return Drawing(
        page.width,
        height,
        figure.title,
        figure.description,
        (
            *_axis(plot),
            *_guides(plot),
            *_direction(plot),
            *(part for lane in figure.lanes for part in gauge(plot, lane)),
            *(part for lane in figure.lanes for part in lane_labels(plot, lane)),
            axis_line(plot.area.bottom, page.left, page.right),
            *look_names(plot),
            *rows,
        ),
    )


def z_ticks(low: float, high: float) -> tuple[float, ...]:
    return round_ticks(low, high, MOST_TICKS, WHOLE_STEPS)


def signed(tick: float) -> str:
    return f"{tick:g}".replace("-", "−")


def _axis(plot: LanePlot) -> tuple[Element, ...]:
    ticks, page = z_ticks(plot.y.low, plot.y.high), plot.page
    grid = (horizontal(plot.y(t), page.left, page.right, *([HAIRLINE] if t == 0 else [])) for t in ticks)
    numbers = (small_print(signed(t), page.numbers_end, plot.y(t) + 4, "end") for t in ticks)
    title = words(axis_title(plot), title_at(plot), 14, size=SMALL, fill=INK_2)
    return (title, *grid, *numbers)


def axis_title(plot: LanePlot) -> Line:
    """On a narrow drawing the direction stands in the title, and alone there where both are too long."""
    title = plot.figure.y_title
    room = plot.page.width - title_at(plot) - (0 if plot.page.short else TOOLS)
    if not plot.page.short:
        return shortened_line(title, room, size=SMALL)
    up = f"; up {plot.figure.favours_up}"
    whole = (*title, Span(up))
    return (
        whole if line_width(whole, SMALL) <= room else shortened_line((title[0], Span(up)), room, size=SMALL)
    )


def title_at(plot: LanePlot) -> float:
    """Over the axis, where its numbers begin."""
    highest = max(z_ticks(plot.y.low, plot.y.high))
    return plot.page.numbers_end - text_width(signed(highest), SMALL)


def _direction(plot: LanePlot) -> tuple[Element, ...]:
    """What up and down mean."""
    return tuple(small_print(text, x, y) for text, x, y in direction_at(plot))


def direction_at(plot: LanePlot) -> list[tuple[str, float, float]]:
    """Words astride the zero line; left of the numbers when a lane stands there."""
    if plot.page.short:
        return []
    up, down, zero = f"↑ {plot.figure.favours_up}", f"↓ {plot.figure.favours_down}", plot.y(0)
    first = min((plot.middle(lane) for lane in plot.figure.lanes), default=plot.page.right)
    left = plot.page.zero + 2
    if left + max(text_width(up, SMALL), text_width(down, SMALL)) + 8 <= first - plot.lane_width / 2:
        return [(up, left, zero - 6), (down, left, zero + 15)]
    up, down = (shortened(text, BESIDE_NUMBERS, size=SMALL) for text in (up, down))
    return [
        (up, BESIDE_NUMBERS - text_width(up, SMALL), zero - 6),
        (down, BESIDE_NUMBERS - text_width(down, SMALL), zero + 15),
    ]


def _guides(plot: LanePlot) -> tuple[Element, ...]:
    """Dotted lines between the bounds of neighbouring looks; the lanes are drawn over them."""
    paths = "".join(
        "M" + "L".join(f"{coordinate(x)} {coordinate(y)}" for x, y in guide) for guide in guides(plot)
    )
    return (element("path", d=paths, fill="none", stroke=INK_3, stroke_dasharray="1 3"),) if paths else ()


def guides(plot: LanePlot) -> list[list[tuple[float, float]]]:
    """The points that each guide joins: the upper bounds, those below, those of harm."""
    lanes = plot.figure.lanes
    upper = [number(lane.upper) for lane in lanes]
    lower = [_lower_guide(plot, lane) for lane in lanes]
    harm = [None if plot.is_masked else number(lane.harm) for lane in lanes]
    joined = [
        [(plot.middle(lane), plot.y(z)) for lane, z in zip(lanes, bounds, strict=True) if z is not None]
        for bounds in (upper, lower, harm)
    ]
    return [points for points in joined if len(points) > 1]


def _lower_guide(plot: LanePlot, lane: Lane) -> float | None:
    """The lower bound; with futility and no lower bound, the futility bound."""
    if lane.lower is None and not plot.is_masked:
        return number(lane.futility)
    return lower_bound(lane)
