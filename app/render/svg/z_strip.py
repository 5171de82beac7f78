"""The gauge of one look lying down: z above, bounds below. Masked, A's reading over B's.

The grammar is that of the lanes: grey beyond efficacy and harm, hatched beyond futility.
"""

from __future__ import annotations

from dataclasses import dataclass

from app.render.palette import CROSSED, CROSSED_ZONE, HATCH_NOW, INK, INK_2, INK_3, PAPER, ZONE_NOW
from app.render.svg.drawing import Drawing, diamond, disc, hatch, rectangle
from app.render.svg.element import Element, coordinate, element
from app.render.svg.geometry import Box, Scale, kept_apart
from app.render.svg.lettering import LABEL, SMALL, text_width, words
from app.render.svg.limits import Limit, Limits, is_reached, limits_read
from app.sheets.blocks import Span, ZStrip

TOP, TALL, TALL_MASKED = 19.5, 18.0, 24.0
LETTERS = 14.0  # what the letters of two readings take
NAMES_APART = 6.0


@dataclass(frozen=True)
class Gauge:
    """A strip with its scale and its readings, each a row and its limits."""

    strip: ZStrip
    x: Scale
    rows: tuple[tuple[Box, Limits], ...]

    @property
    def z(self) -> float | None:
        return _value(self.strip.z)

    @property
    def bottom(self) -> float:
        return self.rows[-1][0].bottom

    def is_crossed(self, limit: Limit) -> bool:
        return self.strip.crossed and is_reached(self.z, limit)

    @property
    def crosses_a_bar(self) -> bool:
        return any(self.is_crossed(limit) for _, limits in self.rows for limit in limits)


def drawn(strip: ZStrip, width: float) -> Drawing:
    gauge = _gauge(strip, width)
    parts = (
        *(part for row, limits in gauge.rows for part in _row(gauge, row, limits)),
        *_letters(gauge),
        *_mark(gauge),
        *_names(gauge, width),
    )
    return Drawing(width, gauge.bottom + 18.5, strip.title, strip.description, parts)


def _gauge(strip: ZStrip, width: float) -> Gauge:
    lower = _value(strip.lower)
    below = (None if lower is None else -abs(lower), _value(strip.harm), _value(strip.futility))
    readings = limits_read(_value(strip.upper), *below, masked=strip.masked)
    left = LETTERS if strip.masked else 0.0
    x = _scale(strip, [limit.z for limits in readings for limit in limits], left, width)
    height = (TALL_MASKED if strip.masked else TALL) / len(readings)
    rows = (
        (Box(x.start, TOP + height * row, x.end, TOP + height * (row + 1)), limits)
        for row, limits in enumerate(readings)
    )
    return Gauge(strip, x, tuple(rows))


def _value(span: Span | None) -> float | None:
    return span.value if span else None


def _scale(strip: ZStrip, limits: list[float], left: float, width: float) -> Scale:
    """Everything on it with room around; symmetric where bounds stand on both sides."""
    z = _value(strip.z)
    values = [0.0, *limits, *([z] if z is not None else [])]
    low, high = min(-1.0, min(values) - 0.7), max(4.0, max(values) + 0.7)
    if strip.lower is not None or strip.masked:
        high = max(high, -low)
        low = -high
    return Scale(low, high, left + 0.5, width - 0.5)


# --- a reading ----------------------------------------------------------------------------------------------


def _row(gauge: Gauge, row: Box, limits: Limits) -> list[Element]:
    """Grey zones, the hatch over them, the edge, and the bars."""
    parts = [_zone(gauge, row, limit) for limit in sorted(limits, key=lambda limit: limit.kind == "futility")]
    return [*parts, rectangle(row, "none", INK_3), *(_bar(gauge, row, limit) for limit in limits)]


def _zone(gauge: Gauge, row: Box, limit: Limit) -> Element:
    at = gauge.x(limit.z)
    box = Box(at, row.top, row.right, row.bottom) if limit.above else Box(row.left, row.top, at, row.bottom)
    if limit.kind == "futility":
        return hatch(box, HATCH_NOW)
    return rectangle(box, CROSSED_ZONE if gauge.is_crossed(limit) else ZONE_NOW)


def _bar(gauge: Gauge, row: Box, limit: Limit) -> Element:
    dashed = limit.kind == "futility"
    return element(
        "path",
        d=f"M{coordinate(gauge.x(limit.z))} {coordinate(row.top)}V{coordinate(row.bottom)}",
        stroke=CROSSED if gauge.is_crossed(limit) else INK,
        stroke_width=1.75 if dashed else 2.5,
        stroke_dasharray="3 2" if dashed else None,
        fill="none",
    )


def _letters(gauge: Gauge) -> list[Element]:
    """A and B before the two readings."""
    if not gauge.strip.masked:
        return []
    rows = (row for row, _ in gauge.rows)
    return [
        words(letter, 0, (row.top + row.bottom) / 2 + 4, size=SMALL, fill=INK_2)
        for letter, row in zip("AB", rows, strict=True)
    ]


# --- z and names --------------------------------------------------------------------------------------------


def _mark(gauge: Gauge) -> list[Element]:
    """A disc, crossed a diamond, open where the bound only advises; masked, one mark has two readings."""
    z, shown, strip = gauge.z, gauge.strip.z, gauge.strip
    if z is None or shown is None:
        return []
    marked = strip.crossed and not strip.masked
    fill, at, middle = CROSSED if marked else INK, gauge.x(z), (TOP + gauge.bottom) / 2
    half = text_width(f"z {shown.text}", semibold=True) / 2
    place = min(max(at, half), gauge.x.end - half)
    said = words(
        (Span("z", "symbol"), Span(f"\u00a0{shown.text}")),
        place,
        13,
        fill=fill,
        anchor="middle",
        semibold=True,
    )
    if not marked:
        return [said, *_level(gauge, at), disc(at, middle, 7, PAPER), disc(at, middle, 5.5, INK)]
    if gauge.crosses_a_bar:
        return [said, diamond(at, middle, 9.5, PAPER), diamond(at, middle, 7.5, CROSSED)]
    return [said, diamond(at, middle, 7.5, PAPER, CROSSED, 1.75)]


def _level(gauge: Gauge, at: float) -> list[Element]:
    """Masked, a hairline through both readings."""
    if not gauge.strip.masked:
        return []
    return [
        element("path", d=f"M{coordinate(at)} {TOP:g}V{coordinate(gauge.bottom)}", stroke=INK, fill="none")
    ]


def _names(gauge: Gauge, width: float) -> list[Element]:
    """Each bound's name and number under its bar, those on the left ending there; kept from one another."""
    named = sorted(_named(gauge.strip), key=lambda each: each[1])
    lengths = [text_width(text, LABEL) for text, _, _ in named]
    wanted = [
        min(max(gauge.x(z) + (2 - length if ends_there else -2), 0.0), width - length)
        for (_, z, ends_there), length in zip(named, lengths, strict=True)
    ]
    return [
        words(text, left, gauge.bottom + 15)
        for (text, _, _), left in zip(named, _apart(wanted, lengths, width), strict=True)
    ]


def _apart(wanted: list[float], lengths: list[float], width: float) -> list[float]:
    """Ordered words moved off one another, and inside the strip as far as there is room."""
    steps = [length + NAMES_APART for length in lengths]
    left = list(kept_apart(wanted, steps[:-1])) if wanted else []
    for index in range(len(left)):
        left[index] = max(left[index], left[index - 1] + steps[index - 1] if index else 0.0)
    for index in reversed(range(len(left))):
        end = left[index + 1] - NAMES_APART if index + 1 < len(left) else width
        left[index] = min(left[index], end - lengths[index])
    return left


def _named(strip: ZStrip) -> list[tuple[str, float, bool]]:
    """Words, where their bar is, and whether they end there. Masked, futility and harm are two bars each."""
    word = "bound" if strip.lower is not None and not strip.masked else "efficacy"
    spans = [(word, strip.upper, 1, False), (word, strip.lower, -1, True)]
    if not strip.masked:
        spans += [("futility", strip.futility, 0, True), ("harm", strip.harm, 0, True)]
    return [
        (f"{word}\u00a0{span.text}", span.value if side == 0 else side * abs(span.value), ends_there)
        for word, span, side, ends_there in spans
        if span is not None and span.value is not None
    ]
