"""The sheet of paper a figure is drawn on, and the few marks every figure shares."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from app.render.palette import GRID, HAIRLINE, INK_2, INK_3, PAPER
from app.render.svg.element import NAMESPACE, Element, coordinate, element
from app.render.svg.geometry import Box, hatching, snapped
from app.render.svg.lettering import LABEL, SANS, SMALL, Anchor, words

WIDE = 740.0
NARROW = 343.0
STRIP = 380.0
HATCH_APART = 7.0


@dataclass(frozen=True)
class Drawing:
    """A finished figure. `title` and `description` are what a screen reader says of it."""

    width: float
    height: float
    title: str
    description: str
    parts: tuple[Element, ...]

    def __str__(self) -> str:
        return str(
            element(
                "svg",
                element("title", self.title or " "),
                element("desc", self.description or " "),
                *self.parts,
                xmlns=NAMESPACE,
                viewBox=f"0 0 {self.width:g} {self.height:g}",
                width=self.width,
                height=self.height,
                role="img",
                font_family=SANS,
                font_size=LABEL,
            )
        )


def horizontal(y: float, left: float, right: float, stroke: str = GRID) -> Element:
    """A hairline across, on whole pixels."""
    return element("path", d=f"M{left:g} {snapped(y):g}H{right:g}", stroke=stroke, fill="none")


def vertical(x: float, top: float, bottom: float, stroke: str = GRID) -> Element:
    return element("path", d=f"M{snapped(x):g} {top:g}V{bottom:g}", stroke=stroke, fill="none")


def rectangle(box: Box, fill: str, stroke: str | None = None) -> Element:
    return element(
        "rect", x=box.left, y=box.top, width=box.width, height=box.height, fill=fill, stroke=stroke
    )


def hatch(box: Box, stroke: str) -> Element:
    """Hatching as computed segments: printers of SVG know no pattern."""
    lines = "".join(
        f"M{coordinate(x1)} {coordinate(y1)}L{coordinate(x2)} {coordinate(y2)}"
        for x1, y1, x2, y2 in hatching(box, HATCH_APART)
    )
    return element("path", d=lines or "M0 0", fill="none", stroke=stroke)


def disc(x: float, y: float, radius: float, fill: str) -> Element:
    return element("circle", cx=x, cy=y, r=radius, fill=fill)


def diamond(
    x: float, y: float, reach: float, fill: str, stroke: str | None = None, width: float | None = None
) -> Element:
    corners = ((0, -reach), (reach, 0), (0, reach), (-reach, 0))
    return element(
        "polygon",
        points=" ".join(f"{coordinate(x + dx)},{coordinate(y + dy)}" for dx, dy in corners),
        fill=fill,
        stroke=stroke,
        stroke_width=width,
    )


def ground(x: float, y: float, width: float, size: float = LABEL) -> Element:
    """A paper rectangle behind a label that stands on a line (baseline `y`)."""
    return rectangle(Box(x - 2, y - size, x + width + 2, y + 0.3 * size), PAPER)


def axis_line(y: float, left: float, right: float) -> Element:
    return horizontal(y, left, right, INK_3)


def ticks_below(y: float, places: Iterable[float], length: float = 5.0) -> Element:
    """Short strokes under an axis at `y`."""
    down = "".join(f"M{snapped(x):g} {snapped(y):g}v{length:g}" for x in places)
    return element("path", d=down or "M0 0", stroke=INK_3, fill="none")


def small_print(text: str, x: float, y: float, anchor: Anchor = "start") -> Element:
    return words(text, x, y, size=SMALL, fill=INK_2, anchor=anchor)


def rule(y: float, left: float, right: float) -> Element:
    return horizontal(y, left, right, HAIRLINE)
