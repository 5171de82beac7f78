"""log(-log S) against log time, to read values from."""

from __future__ import annotations

import math

from app.render.palette import arm_ink
from app.render.plotly_figures.panel import axes, paper, titles_at
from app.render.plotly_figures.setting import Json, layout, step_line, words_at
from app.render.svg import log_log as drawing
from app.render.svg.panel import HALF_PAGE, NARROW_PAGE, WIDE_PAGE, Page
from app.sheets.blocks import LogLogFigure, LogLogLine


def wide(figure: LogLogFigure) -> Json:
    return _chart(figure, WIDE_PAGE)


def half(figure: LogLogFigure) -> Json:
    return _chart(figure, HALF_PAGE)


def narrow(figure: LogLogFigure) -> Json:
    return _chart(figure, NARROW_PAGE)


def _chart(figure: LogLogFigure, page: Page) -> Json:
    x, y = axes(figure, *drawing.scales(figure, page))
    names = [
        words_at(paper(page), text, left, baseline, colour=arm_ink(line.arm).text, semibold=True)
        for line, text, left, baseline in drawing.names_at(figure, page)
    ]
    setting = layout(paper(page), x=x, y=y, notes=[*titles_at(figure, page), *names])
    traces = [trace for line in figure.lines for trace in _line(line)]
    return {"data": traces, "layout": {**setting, "hovermode": "closest"}}


def _line(line: LogLogLine) -> list[Json]:
    """Hovering says time and share in their own units, not in logarithms."""
    read = [
        [math.exp(at), 100.0 * -math.expm1(-math.exp(height))]
        for at, height in zip(line.log_time, line.log_minus_log, strict=True)
    ]
    return step_line(
        line.log_time,
        line.log_minus_log,
        arm_ink(line.arm),
        name=line.arm.name,
        hover="%{fullData.name}: %{customdata[1]:.1f}% at %{customdata[0]:.2f}",
        customdata=read,
    )
