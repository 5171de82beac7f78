"""Probabilities as strips over one scale: a track each, a disc where it stands, the number at the end.

While masked the two readings of an effect stand close together, the next effect a little apart.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

from app.render.palette import GRID, HAIRLINE, INK, PAPER
from app.render.svg.drawing import NARROW, WIDE, Drawing, disc, horizontal, small_print, vertical
from app.render.svg.element import Element, coordinate, element
from app.render.svg.geometry import Scale
from app.render.svg.lettering import point_offset, words
from app.sheets.blocks import Chance, ChancesFigure, Span

TICKS = (0, 25, 50, 75, 100)
FIRST, RADIUS = 9.0, 4.5


@dataclass(frozen=True)
class Places:
    """Where things stand on the wide and on the narrow drawing; `point` is where decimal points stand."""

    width: float
    reading_end: float
    zero: float
    hundred: float
    point: float
    limits: float | None  # where the trend's limits are said, if there is room


WIDE_PLACES = Places(WIDE, 155, 168, 592, 630, 662)
NARROW_PLACES = Places(NARROW, 127, 138, 290, 326, None)


def wide(figure: ChancesFigure) -> Drawing:
    return _drawn(figure, WIDE_PLACES, figure.unit)


def narrow(figure: ChancesFigure) -> Drawing:
    return _drawn(figure, NARROW_PLACES, figure.short_unit)


def _drawn(figure: ChancesFigure, places: Places, unit: str) -> Drawing:
    x = Scale(0, 100, places.zero, places.hundred)
    rows = _heights(figure.chances)
    bottom = max(rows, default=0.0) + 9
    named = zip(figure.chances, rows, _begins(figure.chances), strict=True)
    parts = (
        *(vertical(x(tick), 0, bottom, GRID) for tick in TICKS),
        *(part for chance, y, begins in named for part in _strip(chance, y, begins, x, places)),
        *(small_print(str(tick), x(tick), bottom + 13, "middle") for tick in TICKS),
        small_print(unit, 0, bottom + 13),
    )
    return Drawing(places.width, bottom + 17, figure.title, figure.description, parts)


def _begins(chances: tuple[Chance, ...]) -> list[bool]:
    """Whether each strip is the first of its effect."""
    return [True, *(here.effect != before.effect for before, here in pairwise(chances))][: len(chances)]


def _heights(chances: tuple[Chance, ...]) -> list[float]:
    """Where the tracks lie: two readings of an effect 14 apart, effects 20."""
    heights: list[float] = []
    for begins in _begins(chances):
        heights.append(heights[-1] + (20 if begins else 14) if heights else FIRST)
    return heights


def _strip(chance: Chance, y: float, begins: bool, x: Scale, places: Places) -> list[Element]:
    text = y + 4.5
    parts = [words(chance.effect, 0, text)] if begins else []
    if chance.reading:
        parts.append(small_print(chance.reading, places.reading_end, text, "end"))
    return [*parts, *_stand(chance, y, x, places)]


def _stand(chance: Chance, y: float, x: Scale, places: Places) -> list[Element]:
    """The track with its disc and the number at its end; words in its place where there is no number."""
    said, text = chance.percent, y + 4.5
    if said.value is None:
        return [words(said.text, x.start + 4, text)]
    at, point = x(100 * said.value), places.point - point_offset(said.text, semibold=True)
    return [
        horizontal(y, x.start, x.end, HAIRLINE),
        *_limits(chance, y, x, places),
        disc(at, y, RADIUS + 1.5, PAPER),
        disc(at, y, RADIUS, INK),
        words(said.text, point, text, semibold=True),
    ]


def _limits(chance: Chance, y: float, x: Scale, places: Places) -> list[Element]:
    """A line between the limits of the effect, and in words where there is room."""
    low, high = chance.low, chance.high
    if low is None or high is None or low.value is None or high.value is None:
        return []
    left, right = sorted((x(100 * low.value), x(100 * high.value)))
    path = f"M{coordinate(left)} {coordinate(y)}H{coordinate(right)}"
    parts = [element("path", d=path, stroke=INK, stroke_width=1.75, fill="none")]
    if places.limits is not None:
        parts.append(small_print(_between(low, high), places.limits, y + 4.5))
    return parts


def _between(low: Span, high: Span) -> str:
    return f"{low.text} to {high.text}"
