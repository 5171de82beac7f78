"""One plot between two axes: what the figures share that can stand beside each other, each half as wide."""

from __future__ import annotations

from dataclasses import dataclass

from app.render.svg.drawing import NARROW, WIDE, axis_line, horizontal, small_print, ticks_below
from app.render.svg.element import Element
from app.render.svg.geometry import Box, Scale
from app.render.svg.lettering import SMALL, shortened, text_width
from app.sheets.blocks import LogLogFigure, ResidualFigure

HALF = 360.0  # two of them with a gap make a wide drawing
UNDER_NUMBERS = 38.0  # from the axis down to a title that stands under its numbers

PanelFigure = LogLogFigure | ResidualFigure


@dataclass(frozen=True)
class Page:
    """Where things stand on the wide, the half and the narrow drawing."""

    width: float
    plot: Box
    height: float
    numbers_end: float
    title_below: bool  # the title of the time axis stands under its numbers, else left of them

    @property
    def beside(self) -> float:
        """The room right of the plot."""
        return self.width - self.plot.right


WIDE_PAGE = Page(WIDE, Box(176, 26.5, 648, 346.5), 372, 167, False)
HALF_PAGE = Page(HALF, Box(34, 26.5, 284, 326.5), 372, 26, True)
NARROW_PAGE = Page(NARROW, Box(40, 26.5, 270, 246.5), 290, 31, True)


def titles(figure: PanelFigure, page: Page) -> tuple[tuple[str, float, float], ...]:
    """The titles of the axes: words, left and baseline."""
    left = max(0.0, page.numbers_end - text_width("100", SMALL))
    below = page.plot.bottom + (UNDER_NUMBERS if page.title_below else 20)
    return (
        (shortened(figure.y_title, page.width - left, size=SMALL), left, 14.0),
        (shortened(figure.x_title, page.plot.left + 160, size=SMALL), 0.0, below),
    )


def axes(figure: PanelFigure, page: Page, x: Scale, y: Scale) -> tuple[Element, ...]:
    """Grid and numbers of both axes, and their titles."""
    shown = ticks_apart(figure, x)
    return (
        *(horizontal(y(at), page.plot.left, page.plot.right) for at, _ in figure.y_ticks),
        *(small_print(text, page.numbers_end, y(at) + 4, "end") for at, text in figure.y_ticks),
        axis_line(page.plot.bottom, page.plot.left, page.plot.right),
        ticks_below(page.plot.bottom, [x(at) for at, _ in shown]),
        *(small_print(text, x(at), page.plot.bottom + 20, "middle") for at, text in shown),
        *(small_print(*title) for title in titles(figure, page)),
    )


def ticks_apart(figure: PanelFigure, x: Scale) -> list[tuple[float, str]]:
    """Ticks from the last to the first whose numbers do not touch."""
    shown: list[tuple[float, str]] = []
    for at, text in reversed(figure.x_ticks):
        if not shown or x(shown[-1][0]) - x(at) > text_width(text, SMALL) + 12:
            shown.append((at, text))
    return shown[::-1]
