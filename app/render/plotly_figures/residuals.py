"""The hazard ratio over time, to read values from."""

from __future__ import annotations

import math

from app.render.palette import BAND, INK, INK_2, INK_3, MANY_MARKS
from app.render.plotly_figures.panel import axes, paper, titles_at
from app.render.plotly_figures.setting import Json, layout, words_at
from app.render.svg import residuals as drawing
from app.render.svg.lettering import SMALL
from app.render.svg.panel import HALF_PAGE, NARROW_PAGE, WIDE_PAGE, Page
from app.render.svg.residuals import MANY
from app.sheets.blocks import ResidualFigure, SmoothPoint


def wide(figure: ResidualFigure) -> Json:
    return _chart(figure, WIDE_PAGE)


def half(figure: ResidualFigure) -> Json:
    return _chart(figure, HALF_PAGE)


def narrow(figure: ResidualFigure) -> Json:
    return _chart(figure, NARROW_PAGE)


def _chart(figure: ResidualFigure, page: Page) -> Json:
    x, y = axes(figure, *drawing.scales(figure, page))
    setting = layout(paper(page), x=x, y=y, notes=_notes(figure, page), shapes=_across(figure))
    traces = [_band(figure.smooth), _marks(figure), _smooth(figure.smooth)]
    return {"data": traces, "layout": {**setting, "hovermode": "closest"}}


def _band(smooth: tuple[SmoothPoint, ...]) -> Json:
    """Along the upper limits, and back along the lower ones."""
    back = smooth[::-1]
    return {
        "type": "scatter",
        "mode": "lines",
        "x": [place.time for place in (*smooth, *back)],
        "y": [*(place.high for place in smooth), *(place.low for place in back)],
        "line": {"width": 0},
        "fill": "toself",
        "fillcolor": BAND,
        "hoverinfo": "skip",
    }


def _marks(figure: ResidualFigure) -> Json:
    many = len(figure.points) > MANY
    return {
        "type": "scatter",
        "mode": "markers",
        "x": [time for time, _ in figure.points],
        "y": [height for _, height in figure.points],
        "marker": {
            "symbol": "square",
            "size": drawing.SMALL_MARK if many else drawing.MARK,
            "color": MANY_MARKS if many else INK_3,
        },
        "hoverinfo": "skip",
    }


def _smooth(smooth: tuple[SmoothPoint, ...]) -> Json:
    """Hovering says the ratio and its limits, not their logarithms."""
    read = [[math.exp(each) for each in (place.log_ratio, place.low, place.high)] for place in smooth]
    ratio, low, high = (f"%{{customdata[{at}]:.3f}}" for at in range(3))
    return {
        "type": "scatter",
        "mode": "lines",
        "name": "smooth",
        "x": [place.time for place in smooth],
        "y": [place.log_ratio for place in smooth],
        "line": {"color": INK, "width": 2.5},
        "customdata": read,
        "hovertemplate": f"at %{{x:.1f}}: {ratio} ({low} to {high})<extra></extra>",
    }


def _across(figure: ResidualFigure) -> list[Json]:
    """A ratio of 1, and the one ratio for all times."""
    lines: tuple[tuple[float, Json], ...] = (
        (0.0, {"color": INK_3, "width": 1}),
        (figure.constant, {"color": INK_2, "width": 1, "dash": "4px 3px"}),
    )
    return [
        {"type": "line", "xref": "paper", "x0": 0, "x1": 1, "y0": at, "y1": at, "line": line}
        for at, line in lines
    ]


def _notes(figure: ResidualFigure, page: Page) -> list[Json]:
    small = [words_at(paper(page), text, x, y, size=SMALL) for text, x, y in drawing.directions(figure, page)]
    labels = [words_at(paper(page), text, x, y, colour=INK) for text, x, y in drawing.labels_at(figure, page)]
    return [*titles_at(figure, page), *small, *labels]
