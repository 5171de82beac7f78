"""The hazard ratio over time: a mark for each event, the smooth through them, and one ratio for all times."""

from __future__ import annotations

from app.render.palette import BAND, INK, INK_2, INK_3, MANY_MARKS
from app.render.svg.drawing import Drawing, small_print
from app.render.svg.element import Element, coordinate, element
from app.render.svg.geometry import Scale, apart_within, snapped
from app.render.svg.lettering import SMALL, shortened, words
from app.render.svg.panel import HALF_PAGE, NARROW_PAGE, WIDE_PAGE, Page, axes
from app.sheets.blocks import ResidualFigure

MANY = 250  # events, from where on their marks are smaller and paler
MARK, SMALL_MARK = 2.5, 1.75  # the sides of the squares
CELL, SMALL_CELL = 0.5, 1.0  # marks that fall on one place of this grid are one mark
DIRECTION_ROOM = 20.0  # above the highest mark and below the lowest, for whom a ratio there favours
LABEL_GAP = 16.0
BASELINE = 4.5


def wide(figure: ResidualFigure) -> Drawing:
    return _drawn(figure, WIDE_PAGE)


def half(figure: ResidualFigure) -> Drawing:
    return _drawn(figure, HALF_PAGE)


def narrow(figure: ResidualFigure) -> Drawing:
    return _drawn(figure, NARROW_PAGE)


def _drawn(figure: ResidualFigure, page: Page) -> Drawing:
    x, y = scales(figure, page)
    return Drawing(
        page.width,
        page.height,
        figure.title,
        figure.description,
        (
            _band(figure, x, y),
            *axes(figure, page, x, y),
            _marks(figure, x, y),
            _across(y(0.0), page, INK_3),
            _across(y(figure.constant), page, INK_2, dashes="4 3"),
            _smooth(figure, x, y),
            *(small_print(*direction) for direction in directions(figure, page)),
            *(words(*label, fill=INK) for label in labels_at(figure, page)),
        ),
    )


def scales(figure: ResidualFigure, page: Page) -> tuple[Scale, Scale]:
    """Time from 0 to the last event; every mark and limit in view, and a ratio of 1."""
    heights = [height for _, height in figure.points]
    limits = [end for place in figure.smooth for end in (place.low, place.high)]
    low, high = min(0.0, *heights, *limits), max(0.0, *heights, *limits)
    last = max(time for time, _ in figure.points)
    bottom, top = page.plot.bottom - DIRECTION_ROOM, page.plot.top + DIRECTION_ROOM
    inner = Scale(low, high, bottom, top)
    return (
        Scale(0.0, last, page.plot.left, page.plot.right),
        Scale(inner.inverse(page.plot.bottom), inner.inverse(page.plot.top), page.plot.bottom, page.plot.top),
    )


def _band(figure: ResidualFigure, x: Scale, y: Scale) -> Element:
    """Along the upper limits, and back along the lower ones."""
    upper = [(x(place.time), y(place.high)) for place in figure.smooth]
    lower = [(x(place.time), y(place.low)) for place in reversed(figure.smooth)]
    return element("path", d=f"{_path([*upper, *lower])}Z", fill=BAND)


def _smooth(figure: ResidualFigure, x: Scale, y: Scale) -> Element:
    path = _path([(x(place.time), y(place.log_ratio)) for place in figure.smooth])
    return element("path", d=path, fill="none", stroke=INK, stroke_width=2.5)


def _path(places: list[tuple[float, float]]) -> str:
    return "M" + "L".join(f"{coordinate(x)} {coordinate(y)}" for x, y in places)


def _marks(figure: ResidualFigure, x: Scale, y: Scale) -> Element:
    """All marks in one path; a cloud of 30,000 events is no larger than the paper it stands on."""
    few = len(figure.points) <= MANY
    size, cell, ink = (MARK, CELL, INK_3) if few else (SMALL_MARK, SMALL_CELL, MANY_MARKS)
    places = {(round(x(time) / cell), round(y(height) / cell)) for time, height in figure.points}
    square = f"h{size:g}v{size:g}h-{size:g}z"
    corners = ((cell * left - size / 2, cell * top - size / 2) for left, top in sorted(places))
    path = "".join(f"M{coordinate(left)} {coordinate(top)}{square}" for left, top in corners)
    return element("path", d=path, fill=ink)


def _across(y: float, page: Page, ink: str, dashes: str | None = None) -> Element:
    path = f"M{page.plot.left:g} {snapped(y):g}H{page.plot.right:g}"
    return element("path", d=path, fill="none", stroke=ink, stroke_dasharray=dashes)


def directions(figure: ResidualFigure, page: Page) -> tuple[tuple[str, float, float], ...]:
    """Whom a ratio above and one below 1 favours: words, left and baseline, in the room kept for them."""
    left, room = page.plot.left + 4, page.plot.width - 8
    return (
        (shortened(f"↑ {figure.favours_up}", room, size=SMALL), left, page.plot.top + 13),
        (shortened(f"↓ {figure.favours_down}", room, size=SMALL), left, page.plot.bottom - 7),
    )


def labels_at(figure: ResidualFigure, page: Page) -> tuple[tuple[str, float, float], ...]:
    """What the two lines are, beside their ends, the second with its ratio: words, left and baseline."""
    _, y = scales(figure, page)
    ends = [y(figure.smooth[-1].log_ratio), y(figure.constant) + LABEL_GAP / 2]
    smooth, constant = apart_within(ends, 1.5 * LABEL_GAP, page.plot.top, page.plot.bottom - LABEL_GAP / 2)
    left, first = page.plot.right + 8, constant - LABEL_GAP / 2 + BASELINE
    return (
        ("smooth", left, smooth + BASELINE),
        ("constant", left, first),
        (figure.constant_words.text, left, first + LABEL_GAP),
    )
