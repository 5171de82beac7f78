"""The axes and titles of a chart that stands where a panel was drawn."""

from __future__ import annotations

from app.render.plotly_figures.setting import Json, Sheet, words_at
from app.render.svg.geometry import Scale
from app.render.svg.lettering import SMALL
from app.render.svg.panel import Page, PanelFigure, ticks_apart, titles


def paper(page: Page) -> Sheet:
    return Sheet(page.width, page.height, page.plot)


def axes(figure: PanelFigure, x: Scale, y: Scale) -> tuple[Json, Json]:
    """Both axes with the range and the ticks of the drawing."""
    return _axis(x, ticks_apart(figure, x)), _axis(y, figure.y_ticks)


def _axis(scale: Scale, ticks: list[tuple[float, str]] | tuple[tuple[float, str], ...]) -> Json:
    return {
        "range": [scale.low, scale.high],
        "tickmode": "array",
        "tickvals": [at for at, _ in ticks],
        "ticktext": [text for _, text in ticks],
    }


def titles_at(figure: PanelFigure, page: Page) -> list[Json]:
    return [words_at(paper(page), text, x, y, size=SMALL) for text, x, y in titles(figure, page)]
