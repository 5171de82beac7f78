"""One look as a gauge: grey beyond efficacy and harm, hatched beyond futility, clear between, z as a mark."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from app.render.palette import CROSSED, CROSSED_ZONE, EFFICACY_ZONE, HAIRLINE, HATCH, INK, INK_3, PAPER
from app.render.svg.drawing import HATCH_APART, diamond, disc, hatch, rectangle
from app.render.svg.element import Element, coordinate, element
from app.render.svg.geometry import Box, Segment, hatching, snapped
from app.render.svg.lane_plot import LanePlot, lower_bound, number
from app.render.svg.lettering import words
from app.render.svg.limits import Limit, Limits, is_reached, limits_read
from app.sheets.blocks import Lane

ROOM_FOR_LETTERS = 24.0


@dataclass(frozen=True)
class LaneReading:
    """A lane, or half of one while masked, with the bounds that are read in it."""

    box: Box
    limits: Limits


@dataclass(frozen=True)
class Zone:
    """A part of a lane beyond a bound: filled, or hatched."""

    box: Box
    colour: str
    hatched: bool = False

    @property
    def segments(self) -> tuple[Segment, ...]:
        return hatching(self.box, HATCH_APART)


@dataclass(frozen=True)
class Bar:
    """A bound: a stroke across its lane at height `y`."""

    left: float
    right: float
    y: float
    colour: str
    width: float
    dashed: bool


def gauge(plot: LanePlot, lane: Lane) -> tuple[Element, ...]:
    """Paper, zones, edges, bars, mark: in this order, so that each lies on the one before."""
    readings = lane_readings(plot, lane)
    return (
        rectangle(column(plot, lane), PAPER),
        *(_drawn_zone(zone) for reading in readings for zone in zones(plot, lane, reading)),
        *(rectangle(reading.box, "none", edge_colour(lane)) for reading in readings),
        *(_drawn_bar(bar) for reading in readings for bar in bars(plot, lane, reading)),
        *_letters(plot, readings),
        *_mark(plot, lane),
    )


def column(plot: LanePlot, lane: Lane) -> Box:
    middle, half = plot.middle(lane), plot.lane_width / 2
    return Box(snapped(middle - half), plot.area.top, snapped(middle + half), plot.area.bottom)


def edge_colour(lane: Lane) -> str:
    return INK_3 if lane.state == "now" else HAIRLINE


def lane_readings(plot: LanePlot, lane: Lane) -> tuple[LaneReading, ...]:
    """Masked, the left half is read as if A were experimental, the right one, mirrored, as if B were."""
    box, below = column(plot, lane), (lower_bound(lane), number(lane.harm), number(lane.futility))
    limits = limits_read(number(lane.upper), *below, masked=plot.is_masked)
    middle = plot.middle(lane)
    halves = Box(box.left, box.top, middle, box.bottom), Box(middle, box.top, box.right, box.bottom)
    boxes = halves if plot.is_masked else (box,)
    return tuple(LaneReading(part, read) for part, read in zip(boxes, limits, strict=True))


def is_crossed(lane: Lane, limit: Limit) -> bool:
    """Whether the crossing recorded for this lane is of this bound."""
    return lane.crossed and is_reached(number(lane.z), limit)


def crosses_a_bar(plot: LanePlot, lane: Lane) -> bool:
    """Whether a bound drawn as a solid bar is crossed, and not one that does not bind."""
    return any(is_crossed(lane, limit) for reading in lane_readings(plot, lane) for limit in reading.limits)


# --- zones and bars -----------------------------------------------------------------------------------------


def zones(plot: LanePlot, lane: Lane, reading: LaneReading) -> Iterator[Zone]:
    """Grey beyond efficacy and harm, and over it the hatch beyond futility."""
    for limit in sorted(reading.limits, key=lambda limit: limit.kind == "futility"):
        box = _beyond(plot, reading.box, limit)
        if limit.kind == "futility":
            yield Zone(box, HATCH[lane.state], hatched=True)
        else:
            yield Zone(box, CROSSED_ZONE if is_crossed(lane, limit) else EFFICACY_ZONE[lane.state])


def _beyond(plot: LanePlot, lane: Box, limit: Limit) -> Box:
    y = plot.y(limit.z)
    return Box(lane.left, *((lane.top, lane.right, y) if limit.above else (y, lane.right, lane.bottom)))


def bars(plot: LanePlot, lane: Lane, reading: LaneReading) -> Iterator[Bar]:
    """The bounds themselves, in ink over the zone's edge: solid, dashed for futility."""
    left, right, is_now = reading.box.left, reading.box.right, lane.state == "now"
    for limit in reading.limits:
        dashed = limit.kind == "futility"
        width = (1.75 if is_now else 1.0) if dashed else (2.5 if is_now else 1.5)
        colour = CROSSED if is_crossed(lane, limit) else INK
        yield Bar(left, right, plot.y(limit.z), colour, width, dashed)


def _drawn_zone(zone: Zone) -> Element:
    return (hatch if zone.hatched else rectangle)(zone.box, zone.colour)


def _drawn_bar(bar: Bar) -> Element:
    return element(
        "path",
        d=f"M{coordinate(bar.left)} {coordinate(bar.y)}H{coordinate(bar.right)}",
        fill="none",
        stroke=bar.colour,
        stroke_width=bar.width,
        stroke_dasharray="3 2" if bar.dashed else None,
    )


# --- letters and mark ---------------------------------------------------------------------------------------


def _letters(plot: LanePlot, readings: tuple[LaneReading, ...]) -> tuple[Element, ...]:
    if not plot.is_masked or plot.lane_width < ROOM_FOR_LETTERS:
        return ()
    return tuple(
        words(letter, (reading.box.left + reading.box.right) / 2, plot.area.top - 6, anchor="middle")
        for letter, reading in zip("AB", readings, strict=True)
    )


def _mark(plot: LanePlot, lane: Lane) -> tuple[Element, ...]:
    """Where z stands: a disc, once crossed a diamond; masked, one mark has two readings and stays a disc."""
    z = number(lane.z)
    if z is None:
        return ()
    x, y, radius = plot.middle(lane), plot.y(z), mark_radius(plot, lane)
    if plot.is_masked:
        return _level(plot, lane, y), disc(x, y, radius + 2, PAPER), disc(x, y, radius, INK)
    if not lane.crossed:
        return disc(x, y, radius + 1.5, PAPER), disc(x, y, radius, INK)
    if crosses_a_bar(plot, lane):
        return diamond(x, y, radius + 3, PAPER), diamond(x, y, radius + 1, CROSSED)
    return (diamond(x, y, radius, PAPER, CROSSED, 1.75),)  # a bound that does not bind: an open diamond


def mark_radius(plot: LanePlot, lane: Lane) -> float:
    return min(6.5 if lane.state == "now" else 4.5, plot.lane_width / 2 + 1)


def _level(plot: LanePlot, lane: Lane, y: float) -> Element:
    """A hairline through both readings at the height of z."""
    across = column(plot, lane)
    path = f"M{coordinate(across.left)} {coordinate(y)}H{coordinate(across.right)}"
    return element("path", d=path, stroke=INK, fill="none")
