"""log(-log S) against log time, to read values from."""

from __future__ import annotations

import math

from app.render.palette import arm_ink
from app.render.plotly_figures.setting import Json, Sheet, layout, step_line, words_at
from app.render.svg import log_log as drawing
from app.render.svg.lettering import SMALL
from app.render.svg.log_log import NARROW_PAGE, WIDE_PAGE, Page
from app.sheets.blocks import LogLogFigure, LogLogLine


def wide(figure: LogLogFigure) -> Json:
    return _chart(figure, WIDE_PAGE)


def narrow(figure: LogLogFigure) -> Json:
    return _chart(figure, NARROW_PAGE)


def _chart(figure: LogLogFigure, page: Page) -> Json:
    x_scale, y_scale = drawing.scales(figure, page)
    sheet = Sheet(page.width, page.height, page.plot)
    ticks = drawing.ticks_apart(figure, x_scale)
    x = {"range": [x_scale.low, x_scale.high], "tickmode": "array"}
    x |= {"tickvals": [at for at, _ in ticks], "ticktext": [text for _, text in ticks]}
    y = {"range": [y_scale.low, y_scale.high], "tickmode": "array"}
    y |= {"tickvals": [at for at, _ in figure.y_ticks], "ticktext": [text for _, text in figure.y_ticks]}
    traces = [trace for line in figure.lines for trace in _line(line)]
    setting = layout(sheet, x=x, y=y, notes=_notes(figure, page, sheet))
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


def _notes(figure: LogLogFigure, page: Page, sheet: Sheet) -> list[Json]:
    titles = [words_at(sheet, text, x, y, size=SMALL) for text, x, y in drawing.titles(figure, page)]
    names = [
        words_at(sheet, text, x, y, colour=arm_ink(line.arm).text, semibold=True)
        for line, text, x, y in drawing.names_at(figure, page)
    ]
    return [*titles, *names]
