"""The small figures of At a glance: the spine lying down, intervals on one scale, a gauge lying down."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from app.render.palette import (
    CROSSED,
    CROSSED_ZONE,
    GRID,
    HATCH_NOW,
    INK,
    INK_2,
    INK_3,
    PAPER,
    ZONE_NOW,
    arm_ink,
)
from app.render.svg import counts
from app.render.svg.drawing import (
    NARROW,
    STRIP,
    Drawing,
    diamond,
    disc,
    rectangle,
    small_print,
    vertical,
)
from app.render.svg.element import Element, coordinate, element
from app.render.svg.geometry import Box, Scale, apart_within, hatching, snapped
from app.render.svg.lettering import LABEL, SMALL, fraction_text, shortened, text_width, words
from app.sheets.blocks import CountsFigure, InformationStrip, IntervalMark, IntervalStrip, Span, Strip, ZStrip


def wide(strip: Strip) -> Drawing:
    return drawn(strip, STRIP)


def narrow(strip: Strip) -> Drawing:
    return drawn(strip, NARROW)


def drawn(strip: Strip, width: float) -> Drawing:
    if isinstance(strip, CountsFigure):
        return counts.strip(strip, width)
    if isinstance(strip, InformationStrip):
        return information(strip, width)
    if isinstance(strip, IntervalStrip):
        return intervals(strip, width)
    return gauge(strip, width)


# --- information --------------------------------------------------------------------------------------------

RAIL_TOP, RAIL = 16.5, 5.0
NUMBERS_AT, FRACTIONS_AT = 10.0, 43.5
ROOM_FOR_ONE = 12.0


def information(strip: InformationStrip, width: float) -> Drawing:
    last = max([1.0, *(fraction for fraction, _ in strip.held)])
    x = Scale(0, last, 0.5, width - 0.5)
    held = max((fraction for fraction, _ in strip.held), default=0.0)
    rail = Box(0.5, RAIL_TOP + 0.5, width - 0.5, RAIL_TOP + RAIL - 0.5)
    parts = [
        rectangle(rail, PAPER, INK_3),
        rectangle(Box(0, RAIL_TOP, x(held), RAIL_TOP + RAIL), INK),
        *_held(strip, x),
        _total(strip, x),
        *_fractions(strip, x),
    ]
    return Drawing(width, 47, strip.title, strip.description, tuple(parts))


def _held(strip: InformationStrip, x: Scale) -> list[Element]:
    """A disc a look held, its events above; the last is now."""
    parts: list[Element] = []
    middle = RAIL_TOP + RAIL / 2
    places = _event_places(strip, x)
    for number, ((fraction, events), at) in enumerate(zip(strip.held, places, strict=True), start=1):
        is_now = number == len(strip.held)
        radius = 5.5 if is_now else 4.5
        parts += [disc(x(fraction), middle, radius + 2, PAPER), disc(x(fraction), middle, radius, INK)]
        parts.append(words(events.text, at, NUMBERS_AT, anchor="middle", semibold=is_now))
    return parts


def _event_places(strip: InformationStrip, x: Scale) -> tuple[float, ...]:
    gap = max((text_width(events.text, semibold=True) for _, events in strip.held), default=0.0) + 6
    return apart_within([x(fraction) for fraction, _ in strip.held], gap, gap / 2 - 3, x.end - gap / 2 + 3)


def _total_fits_above(strip: InformationStrip, x: Scale) -> bool:
    start = x.end - text_width(strip.total.text, SMALL)
    return all(at + 20 <= start for at in _event_places(strip, x))


def _total(strip: InformationStrip, x: Scale) -> Element:
    """The planned total above the rail's end; under it when the look shown stands in the way."""
    y = NUMBERS_AT if _total_fits_above(strip, x) else FRACTIONS_AT
    return small_print(strip.total.text, x.end + 0.5, y, "end")


def _fractions(strip: InformationStrip, x: Scale) -> list[Element]:
    """0, the planned fractions and 1 under the rail; one without room for its number keeps its tick."""
    fractions = sorted({0.0, *strip.planned, 1.0})
    right_end = x(1.0) if _total_fits_above(strip, x) else x.end - text_width(strip.total.text, SMALL) - 6
    parts = [_ticks([x(fraction) for fraction in fractions])]
    free_from = 0.0
    for fraction in fractions:
        text, at = fraction_text(fraction), x(fraction)
        width = text_width(text, SMALL)
        left = min(max(at - width / 2, 0.0), x.end - width)
        keeps_clear = left + width <= (right_end if at >= x(1.0) else right_end - ROOM_FOR_ONE)
        if left >= free_from and keeps_clear:
            parts.append(small_print(text, left, FRACTIONS_AT))
            free_from = left + width + 4
    return parts


def _ticks(places: Sequence[float]) -> Element:
    top = RAIL_TOP + RAIL + 4
    down = "".join(f"M{snapped(at - 0.5):g} {top:g}v5" for at in places)
    return element("path", d=down, stroke=INK_2, fill="none")


# --- intervals ----------------------------------------------------------------------------------------------

NAMES_END = 112.0
MARK_PITCH = 20.0


def intervals(strip: IntervalStrip, width: float) -> Drawing:
    """One line an arm over a shared scale, faint ticks, the unit at the left of the numbers."""
    x = Scale(strip.ticks[0], strip.ticks[-1], NAMES_END + 6, width - 12)
    bottom = 4 + MARK_PITCH * len(strip.marks) + 2
    parts = [vertical(x(tick), 0, bottom, GRID) for tick in strip.ticks]
    for row, mark in enumerate(strip.marks):
        parts += _interval(mark, x, 10 + MARK_PITCH * row)
    parts += [small_print(f"{tick:g}", x(tick), bottom + 15, "middle") for tick in strip.ticks]
    parts.append(small_print(shortened(strip.unit, NAMES_END - 4, size=SMALL), 0, bottom + 15))
    return Drawing(width, bottom + 20, strip.title, strip.description, tuple(parts))


def _interval(mark: IntervalMark, x: Scale, y: float) -> list[Element]:
    ink = arm_ink(mark.arm)
    parts = (
        [words(shortened(mark.arm.name, NAMES_END, semibold=True), 0, y + 4.5, fill=ink.text, semibold=True)]
        if mark.arm
        else []
    )
    if mark.low is not None or mark.high is not None:
        parts += _interval_line(mark, x, y)
    at = x(mark.estimate)
    if ink.hollow:
        parts += [disc(at, y, 5.25, ink.line), disc(at, y, 3.25, PAPER)]
    else:
        parts.append(disc(at, y, 4.5, ink.line))
    return parts


def _interval_line(mark: IntervalMark, x: Scale, y: float) -> list[Element]:
    """The line in the arm's style; an end that is not reached runs to the end of the scale."""
    ink = arm_ink(mark.arm)
    left = x.start if mark.low is None else max(x.start, x(mark.low))
    right = x.end if mark.high is None else min(x.end, x(mark.high))
    path = f"M{coordinate(left)} {coordinate(y)}H{coordinate(right)}"
    outer = element("path", d=path, stroke=ink.line, stroke_width=3.25 if ink.hollow else 1.75, fill="none")
    core = element("path", d=path, stroke=PAPER, stroke_width=1.25, fill="none")
    return [outer, core] if ink.hollow else [outer]


# --- z ------------------------------------------------------------------------------------------------------

GAUGE = (19.5, 37.5)
HATCH_APART = 7.0


@dataclass(frozen=True)
class _Bounds:
    """The bounds of a strip as drawn: the lower always below zero."""

    upper: float | None
    lower: float | None
    futility: float | None

    @property
    def all(self) -> list[float]:
        return [value for value in (self.upper, self.lower, self.futility) if value is not None]


def gauge(strip: ZStrip, width: float) -> Drawing:
    """The gauge of one look lying down: z above, bounds below."""
    bounds = _Bounds(
        _value(strip.upper),
        None if strip.lower is None else -abs(_value(strip.lower) or 0),
        _value(strip.futility),
    )
    z = _value(strip.z)
    x = _z_scale(bounds, z, width)
    return Drawing(
        width,
        56,
        strip.title,
        strip.description,
        (
            *_gauge_ground(strip, bounds, x, width),
            *_z_mark(strip, z, x),
            *_bound_words(strip, bounds, x, width),
        ),
    )


def _value(span: Span | None) -> float | None:
    return span.value if span else None


def _z_scale(bounds: _Bounds, z: float | None, width: float) -> Scale:
    values = [0.0, *bounds.all, *([z] if z is not None else [])]
    low, high = min(-1.0, min(values) - 0.7), max(4.0, max(values) + 0.7)
    if bounds.lower is not None:
        high = max(high, -low)
        low = -high
    return Scale(low, high, 0.5, width - 0.5)


def _gauge_ground(strip: ZStrip, bounds: _Bounds, x: Scale, width: float) -> list[Element]:
    top, bottom = GAUGE
    parts: list[Element] = []
    if bounds.upper is not None:
        parts.append(rectangle(Box(x(bounds.upper), top, x.end, bottom), _zone(strip, above=True)))
    if bounds.lower is not None:
        parts.append(rectangle(Box(x.start, top, x(bounds.lower), bottom), _zone(strip, above=False)))
    if bounds.futility is not None:
        parts.append(_hatch(Box(x.start, top, x(bounds.futility), bottom)))
    parts.append(rectangle(Box(0.5, top, width - 0.5, bottom), "none", INK_3))
    for bound, above in ((bounds.upper, True), (bounds.lower, False)):
        if bound is not None:
            parts.append(_upright(x(bound), CROSSED if _is_crossed(strip, above=above) else INK, 2.5))
    if bounds.futility is not None:
        parts.append(_upright(x(bounds.futility), INK, 1.75, "3 2"))
    return parts


def _upright(x: float, stroke: str, width: float, dashes: str | None = None) -> Element:
    path = f"M{coordinate(x)} {GAUGE[0]:g}V{GAUGE[1]:g}"
    return element("path", d=path, stroke=stroke, stroke_width=width, stroke_dasharray=dashes, fill="none")


def _hatch(box: Box) -> Element:
    drawn = "".join(
        f"M{coordinate(a)} {coordinate(b)}L{coordinate(c)} {coordinate(d)}"
        for a, b, c, d in hatching(box, HATCH_APART)
    )
    return element("path", d=drawn or "M0 0", fill="none", stroke=HATCH_NOW)


def _is_crossed(strip: ZStrip, *, above: bool) -> bool:
    return strip.crossed and (_value(strip.z) or 0) * (1 if above else -1) > 0


def _zone(strip: ZStrip, *, above: bool) -> str:
    return CROSSED_ZONE if _is_crossed(strip, above=above) else ZONE_NOW


def _z_mark(strip: ZStrip, z: float | None, x: Scale) -> list[Element]:
    if z is None or strip.z is None:
        return []
    middle = (GAUGE[0] + GAUGE[1]) / 2
    fill = CROSSED if strip.crossed else INK
    said = (Span("z", "symbol"), Span(f"\u00a0{strip.z.text}"))
    half = text_width(f"z {strip.z.text}", semibold=True) / 2
    at = min(max(x(z), half), x.end - half)
    mark = diamond(x(z), middle, 7.5, fill) if strip.crossed else disc(x(z), middle, 5.5, fill)
    ring = diamond(x(z), middle, 9.5, PAPER) if strip.crossed else disc(x(z), middle, 7, PAPER)
    return [words(said, at, 13, fill=fill, anchor="middle", semibold=True), ring, mark]


def _bound_words(strip: ZStrip, bounds: _Bounds, x: Scale, width: float) -> list[Element]:
    """Each bound's name and number under its bar, those at the left ending there, the upper one beginning."""
    two_sided = strip.lower is not None
    named = [
        ("bound" if two_sided else "efficacy", strip.upper, bounds.upper, False),
        ("bound", strip.lower, bounds.lower, True),
        ("futility", strip.futility, bounds.futility, True),
    ]
    parts: list[Element] = []
    for word, span, bound, ends_there in named:
        if span is None or bound is None:
            continue
        text = f"{word}\u00a0{span.text}"
        length = text_width(text, LABEL)
        left = x(bound) + 2 - length if ends_there else x(bound) - 2
        parts.append(words(text, min(max(left, 0), width - length), GAUGE[1] + 15))
    return parts
