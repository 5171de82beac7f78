"""The small figures of At a glance: the spine lying down, intervals on one scale, counts and a gauge."""

from __future__ import annotations

from collections.abc import Sequence

from app.render.palette import (
    GRID,
    INK,
    INK_2,
    INK_3,
    PAPER,
    arm_ink,
)
from app.render.svg import counts, z_strip
from app.render.svg.drawing import (
    NARROW,
    STRIP,
    Drawing,
    disc,
    rectangle,
    small_print,
    vertical,
)
from app.render.svg.element import Element, coordinate, element
from app.render.svg.geometry import Box, Scale, apart_within, snapped
from app.render.svg.lettering import SMALL, fraction_text, shortened, text_width, words
from app.sheets.blocks import CountsFigure, InformationStrip, IntervalMark, IntervalStrip, Strip


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
    return z_strip.drawn(strip, width)


# --- information --------------------------------------------------------------------------------------------

RAIL_TOP, RAIL = 16.5, 5.0
NUMBERS_AT, FRACTIONS_AT = 10.0, 43.5
ROOM_FOR_ONE = 12.0
ROOM_FOR_DISC = 7.5


def information(strip: InformationStrip, width: float) -> Drawing:
    held = max((fraction for fraction, _ in strip.held), default=0.0)
    x = _along(max(1.0, held), held, width)
    rail = Box(0.5, RAIL_TOP + 0.5, x.end, RAIL_TOP + RAIL - 0.5)
    parts = [
        rectangle(rail, PAPER, INK_3),
        rectangle(Box(0, RAIL_TOP, x(held), RAIL_TOP + RAIL), INK),
        *_held(strip, x),
        *_total(strip, x),
        *_fractions(strip, x),
    ]
    return Drawing(width, 47, strip.title, strip.description, tuple(parts))


def _along(last: float, held: float, width: float) -> Scale:
    """The rail from edge to edge; it ends sooner where a disc at its end would be cut."""
    whole = Scale(0, last, 0.5, width - 0.5)
    return whole if whole(held) <= width - ROOM_FOR_DISC else Scale(0, last, 0.5, width - ROOM_FOR_DISC)


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


def _total(strip: InformationStrip, x: Scale) -> tuple[Element, ...]:
    """The planned total above the rail's end; left to the sentence when the look shown stands in the way."""
    fits = _total_fits_above(strip, x)
    return (small_print(strip.total.text, x.end + 0.5, NUMBERS_AT, "end"),) if fits else ()


def _fractions(strip: InformationStrip, x: Scale) -> list[Element]:
    """0, the planned fractions and 1 under the rail; one without room for its number keeps its tick."""
    fractions = sorted({0.0, *strip.planned, 1.0})
    parts = [_ticks([x(fraction) for fraction in fractions])]
    free_from = 0.0
    for fraction in fractions:
        text, at = fraction_text(fraction), x(fraction)
        width = text_width(text, SMALL)
        left = min(max(at - width / 2, 0.0), x.end - width)
        keeps_clear = at >= x(1.0) or left + width <= x(1.0) - ROOM_FOR_ONE
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
