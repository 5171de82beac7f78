"""The plot that lanes stand in: information across, z upwards, one width for all lanes."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

from app.render.svg.drawing import NARROW, WIDE
from app.render.svg.geometry import Box, Scale, snapped
from app.sheets.blocks import BoundaryFigure, Lane, Span


@dataclass(frozen=True)
class LanePage:
    """Where things stand on the wide and on the narrow drawing."""

    width: float
    zero: float  # x of information 0
    one: float  # x of information 1
    left: float  # the axis and its grid
    right: float
    height: float
    lane: float
    two_lanes: float
    numbers_end: float
    tallest: float  # the whole drawing: rows beyond it take their room from the lanes
    short: bool


# 430 under an answer of one line ends where the caution of a laptop screen begins
WIDE_PAGE = LanePage(WIDE, 168, 639, 162, 663, 236, 30, 40, 155, tallest=430, short=False)
NARROW_PAGE = LanePage(NARROW, 36, 309, 30, 335, 220, 22, 30, 24, tallest=math.inf, short=True)
TOP = 24.5
LETTERS = 12.0  # what the letters over two lanes take
ANSWER_LINE = 36.0  # masked, the answer has a second line
FIRST_ROW, ROW_PITCH, RULE_ROOM, UNDER_ROWS = 37.5, 16.0, 9.0, 5.0
SHORTEST = 160.0  # lanes give no more room than this leaves
THINNEST, THIN = 6.0, 18.0


@dataclass(frozen=True)
class LanePlot:
    """A boundary figure on its page, with scales."""

    figure: BoundaryFigure
    page: LanePage
    x: Scale
    y: Scale
    area: Box
    lane_width: float
    pitch: float  # the distance between the closest two lanes

    @property
    def is_masked(self) -> bool:
        return self.figure.layout == "two lanes"

    @property
    def is_two_sided(self) -> bool:
        return not self.is_masked and any(lane.lower for lane in self.figure.lanes)

    def middle(self, lane: Lane) -> float:
        return snapped(self.x(lane.fraction))

    def right_of(self, lane: Lane) -> float:
        return self.middle(lane) + self.lane_width / 2


def lane_plot(figure: BoundaryFigure, page: LanePage) -> LanePlot:
    masked = figure.layout == "two lanes"
    top = TOP + (LETTERS if masked else 0)
    bottom = TOP + page.height + (8 if masked else 0) - _room_for_rows(figure, page)
    area = Box(page.left, top, page.right, max(bottom, top + SHORTEST))
    x = Scale(0, max([1.0, *(lane.fraction for lane in figure.lanes)]), page.zero, page.one)
    low, high = z_range(figure)
    pitch = _closest([x(lane.fraction) for lane in figure.lanes])
    width = _lane_width(page.two_lanes if masked else page.lane, pitch)
    return LanePlot(figure, page, x, Scale(low, high, area.bottom, area.top), area, width, pitch)


def _room_for_rows(figure: BoundaryFigure, page: LanePage) -> float:
    """What the lanes give up so that the drawing with all its rows is not too tall for its page."""
    masked = figure.layout == "two lanes"
    rules = sum(row.rule_above for row in figure.rows)
    rows = FIRST_ROW + ROW_PITCH * (len(figure.rows) - 1) + RULE_ROOM * rules + UNDER_ROWS
    tallest = page.tallest - (ANSWER_LINE if masked else 0)
    return max(0.0, TOP + page.height + (8 if masked else 0) + rows - tallest)


def _closest(places: Sequence[float]) -> float:
    return min((b - a for a, b in pairwise(sorted(places))), default=WIDE)


def _lane_width(asked: float, pitch: float) -> float:
    """Lanes grow thin before they touch."""
    return asked if pitch >= asked + 16 else max(THINNEST, min(asked, pitch - 5, THIN))


def z_range(figure: BoundaryFigure) -> tuple[float, float]:
    """Every z and bound with 0.5 to 1 around them, 0 always in; symmetric while masked or two-sided."""
    values = [0.0, *(value for lane in figure.lanes for value in lane_values(lane))]
    if figure.layout == "two lanes" or any(lane.lower for lane in figure.lanes):
        reach = max(abs(value) for value in values) + 0.5
        return -reach, reach
    return min(values) - 0.9, max(values) + 0.5


def lane_values(lane: Lane) -> list[float]:
    """Every z and bound of a lane that has a place on the axis."""
    lower = (lower_bound(lane), number(lane.futility), number(lane.harm))
    values = (number(lane.z), number(lane.upper), *lower)
    return [value for value in values if value is not None]


def number(span: Span | None) -> float | None:
    """The record's number behind a span, when there is one."""
    return None if span is None else span.value


def lower_bound(lane: Lane) -> float | None:
    """The lower bound as drawn: below zero, whichever sign its recorded number carries."""
    bound = number(lane.lower)
    return None if bound is None else -abs(bound)
