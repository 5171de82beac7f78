"""One look as a gauge: grey beyond its bounds, hatched beyond futility, clear between, z as a mark."""

from __future__ import annotations

from dataclasses import dataclass

from app.render.palette import CROSSED, CROSSED_ZONE, EFFICACY_ZONE, HAIRLINE, HATCH, INK, INK_3, PAPER
from app.render.svg.drawing import diamond, disc, rectangle
from app.render.svg.element import Element, coordinate, element
from app.render.svg.geometry import Box, hatching, snapped
from app.render.svg.lane_plot import LanePlot, is_crossed_above, is_crossed_below, lower_bound, number
from app.render.svg.lettering import words
from app.sheets.blocks import Lane

HATCH_APART = 7.0
ROOM_FOR_LETTERS = 24.0


@dataclass(frozen=True)
class Reading:
    """A lane, or half of one while masked, with the bounds that are read in it."""

    box: Box
    above: float | None = None  # grey above this
    below: float | None = None  # grey below this
    hatch_below: float | None = None
    hatch_above: float | None = None


def gauge(plot: LanePlot, lane: Lane) -> tuple[Element, ...]:
    """Paper, zones, edges, bars, mark: in this order, so that each lies on the one before."""
    readings = _readings(plot, lane)
    edge = INK_3 if lane.state == "now" else HAIRLINE
    return (
        rectangle(_column(plot, lane), PAPER),
        *(part for reading in readings for part in _zones(plot, lane, reading)),
        *(rectangle(reading.box, "none", edge) for reading in readings),
        *(part for reading in readings for part in _bars(plot, lane, reading)),
        *_letters(plot, readings),
        *_mark(plot, lane),
    )


def _column(plot: LanePlot, lane: Lane) -> Box:
    middle, half = plot.middle(lane), plot.lane_width / 2
    return Box(snapped(middle - half), plot.area.top, snapped(middle + half), plot.area.bottom)


def _readings(plot: LanePlot, lane: Lane) -> tuple[Reading, ...]:
    """Masked, the left half is read as if A were experimental, the right one, mirrored, as if B were."""
    column, upper, lower, futility = (
        _column(plot, lane),
        number(lane.upper),
        lower_bound(lane),
        number(lane.futility),
    )
    if not plot.is_masked:
        return (Reading(column, above=upper, below=lower, hatch_below=futility),)
    middle = plot.middle(lane)
    left = Box(column.left, column.top, middle, column.bottom)
    right = Box(middle, column.top, column.right, column.bottom)
    mirrored = None if futility is None else -futility
    return Reading(left, above=upper, hatch_below=futility), Reading(right, below=lower, hatch_above=mirrored)


# --- zones --------------------------------------------------------------------------------------------------


def _zones(plot: LanePlot, lane: Lane, reading: Reading) -> tuple[Element, ...]:
    zones: list[Element] = []
    if reading.above is not None:
        zones.append(rectangle(_over(plot, reading, reading.above), _grey(lane, is_crossed_above(lane))))
    if reading.below is not None:
        zones.append(rectangle(_under(plot, reading, reading.below), _grey(lane, is_crossed_below(lane))))
    if reading.hatch_below is not None:
        zones.append(_hatch(lane, _under(plot, reading, reading.hatch_below)))
    if reading.hatch_above is not None:
        zones.append(_hatch(lane, _over(plot, reading, reading.hatch_above)))
    return tuple(zones)


def _over(plot: LanePlot, reading: Reading, z: float) -> Box:
    return Box(reading.box.left, reading.box.top, reading.box.right, plot.y(z))


def _under(plot: LanePlot, reading: Reading, z: float) -> Box:
    return Box(reading.box.left, plot.y(z), reading.box.right, reading.box.bottom)


def _grey(lane: Lane, is_crossed: bool) -> str:
    return CROSSED_ZONE if is_crossed else EFFICACY_ZONE[lane.state]


def _hatch(lane: Lane, box: Box) -> Element:
    """Computed segments: printers of SVG know no pattern."""
    segments = (
        f"M{coordinate(x1)} {coordinate(y1)}L{coordinate(x2)} {coordinate(y2)}"
        for x1, y1, x2, y2 in hatching(box, HATCH_APART)
    )
    return element("path", d="".join(segments) or "M0 0", fill="none", stroke=HATCH[lane.state])


# --- bars, letters, mark ------------------------------------------------------------------------------------


def _bars(plot: LanePlot, lane: Lane, reading: Reading) -> tuple[Element, ...]:
    """The bounds themselves, in ink over the zone's edge: solid for efficacy, dashed for futility."""
    solid = ((reading.above, is_crossed_above(lane)), (reading.below, is_crossed_below(lane)))
    dashed = (reading.hatch_below, reading.hatch_above)
    is_now = lane.state == "now"
    return (
        *(
            _bar(plot, reading, bound, CROSSED if is_crossed else INK, 2.5 if is_now else 1.5)
            for bound, is_crossed in solid
            if bound is not None
        ),
        *(
            _bar(plot, reading, bound, INK, 1.75 if is_now else 1.0, dashes="3 2")
            for bound in dashed
            if bound is not None
        ),
    )


def _bar(
    plot: LanePlot, reading: Reading, bound: float, stroke: str, width: float, dashes: str | None = None
) -> Element:
    across = f"M{coordinate(reading.box.left)} {coordinate(plot.y(bound))}H{coordinate(reading.box.right)}"
    return element("path", d=across, stroke=stroke, stroke_width=width, stroke_dasharray=dashes, fill="none")


def _letters(plot: LanePlot, readings: tuple[Reading, ...]) -> tuple[Element, ...]:
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
    x, y = plot.middle(lane), plot.y(z)
    radius = min(6.5 if lane.state == "now" else 4.5, plot.lane_width / 2 + 1)
    if plot.is_masked:
        return _level(plot, lane, y), disc(x, y, radius + 2, PAPER), disc(x, y, radius, INK)
    if not lane.crossed:
        return disc(x, y, radius + 1.5, PAPER), disc(x, y, radius, INK)
    if is_crossed_above(lane) or is_crossed_below(lane):
        return diamond(x, y, radius + 3, PAPER), diamond(x, y, radius + 1, CROSSED)
    return (diamond(x, y, radius, PAPER, CROSSED, 1.75),)  # a bound that does not bind: an open diamond


def _level(plot: LanePlot, lane: Lane, y: float) -> Element:
    """A hairline through both readings at the height of z."""
    column = _column(plot, lane)
    return element(
        "path",
        d=f"M{coordinate(column.left)} {coordinate(y)}H{coordinate(column.right)}",
        stroke=INK,
        fill="none",
    )
