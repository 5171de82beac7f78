"""Where things go: scales, round ticks, labels kept apart, hatching, steps. Knows no colour and no words."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from app.render.svg.element import coordinate

ROUND_STEPS = (1.0, 2.0, 2.5, 5.0, 10.0)
WHOLE_STEPS = (1.0, 2.0, 5.0, 10.0)


@dataclass(frozen=True)
class Scale:
    """A straight map of `low`-`high` onto `start`-`end`."""

    low: float
    high: float
    start: float
    end: float

    def __call__(self, value: float) -> float:
        return self.start + (value - self.low) / (self.high - self.low) * (self.end - self.start)

    def inverse(self, place: float) -> float:
        return self.low + (place - self.start) / (self.end - self.start) * (self.high - self.low)


@dataclass(frozen=True)
class Box:
    """A rectangle of the drawing: left, top, right, bottom."""

    left: float
    top: float
    right: float
    bottom: float

    @property
    def width(self) -> float:
        return self.right - self.left

    @property
    def height(self) -> float:
        return self.bottom - self.top


def snapped(place: float) -> float:
    """The nearest half unit, where a hairline falls on whole pixels."""
    return math.floor(place) + 0.5


def round_step(span: float, most: int, steps: Sequence[float] = ROUND_STEPS) -> float:
    """The smallest round step that puts at most `most` intervals into `span`."""
    size = 10.0 ** math.floor(math.log10(span / most))
    return next(step * size for step in steps if step * size * most >= span * (1 - 1e-9))


def round_ticks(
    low: float, high: float, most: int, steps: Sequence[float] = ROUND_STEPS
) -> tuple[float, ...]:
    """Multiples of a round step inside `low`-`high`, at most `most` + 1 of them."""
    step = round_step(high - low, most, steps)
    first, last = math.ceil(low / step - 1e-9), math.floor(high / step + 1e-9)
    return tuple(index * step for index in range(first, last + 1))


def kept_apart(places: Sequence[float], gaps: Sequence[float]) -> tuple[float, ...]:
    """Move ordered `places` as little as possible so that neighbours are `gaps` apart, pushing both evenly.

    `gaps[i]` is the distance wanted between places i and i + 1. Least squares under an order (pooling of
    adjacent violators): within a group that touches, everybody moves by the same amount.
    """
    offsets = [0.0]
    for gap in gaps:
        offsets.append(offsets[-1] + gap)
    groups: list[tuple[float, int]] = []  # mean of the shifted places, how many
    for place, offset in zip(places, offsets, strict=True):
        mean, size = place - offset, 1
        while groups and groups[-1][0] > mean:
            before, count = groups.pop()
            mean, size = (before * count + mean * size) / (count + size), count + size
        groups.append((mean, size))
    means = [mean for mean, size in groups for _ in range(size)]
    return tuple(mean + offset for mean, offset in zip(means, offsets, strict=True))


def apart_within(places: Sequence[float], gap: float, low: float, high: float) -> tuple[float, ...]:
    """`kept_apart` in any order of `places`, and then inside `low`-`high` as far as there is room."""
    order = sorted(range(len(places)), key=lambda index: places[index])
    moved = list(kept_apart([places[index] for index in order], [gap] * (len(places) - 1))) if places else []
    for position in range(len(moved)):
        moved[position] = max(moved[position], low + gap * position)
    for position in reversed(range(len(moved))):
        moved[position] = min(moved[position], high - gap * (len(moved) - 1 - position))
    placed = [0.0] * len(places)
    for position, index in enumerate(order):
        placed[index] = moved[position]
    return tuple(placed)


Segment = tuple[float, float, float, float]


def hatching(box: Box, spacing: float) -> tuple[Segment, ...]:
    """Rising 45-degree lines across `box`, `spacing` apart along its edges, ends on them.

    The lines stand on one grid of the drawing, so that neighbouring boxes continue each other.
    """
    # a rising line is x + y = constant
    first = math.floor((box.left + box.top) / spacing) + 1
    last = math.ceil((box.right + box.bottom) / spacing) - 1
    return tuple(_rising(box, index * spacing) for index in range(first, last + 1))


def _rising(box: Box, total: float) -> Segment:
    left = max(box.left, total - box.bottom)
    right = min(box.right, total - box.top)
    return left, total - left, right, total - right


def step_path(points: Sequence[tuple[float, float]], *, start: str = "M") -> str:
    """A right-continuous step line: across, then down."""
    (x, y), *rest = points
    path = [f"{start}{coordinate(x)} {coordinate(y)}"]
    for x_next, y_next in rest:
        path.append(f"H{coordinate(x_next)}")
        if y_next != y:
            path.append(f"V{coordinate(y_next)}")
        y = y_next
    return "".join(path)


def thinned(points: Sequence[tuple[float, float]], apart: float) -> tuple[tuple[float, float], ...]:
    """A step line with the steps less than `apart` from the last kept one folded into it; ends are kept.

    Below a quarter of a unit nobody sees the difference, and 100,000 subjects stay a small drawing.
    """
    kept = [points[0]]
    for x, y in points[1:]:
        if x - kept[-1][0] < apart and len(kept) > 1:
            kept[-1] = (kept[-1][0], y)
        else:
            kept.append((x, y))
    if points[-1][0] > kept[-1][0]:
        kept.append(points[-1])
    return tuple(kept)
