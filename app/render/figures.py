"""Which module draws which figure."""

from __future__ import annotations

from app.render.svg import boundary, calendar, chances, counts, curves, log_log
from app.render.svg.drawing import Drawing
from app.sheets.blocks import (
    BoundaryFigure,
    CalendarFigure,
    ChancesFigure,
    CurvesFigure,
    Figure,
    LogLogFigure,
)


def wide(figure: Figure) -> Drawing:
    if isinstance(figure, CurvesFigure):
        return curves.wide(figure)
    if isinstance(figure, BoundaryFigure):
        return boundary.wide(figure)
    if isinstance(figure, CalendarFigure):
        return calendar.wide(figure)
    if isinstance(figure, LogLogFigure):
        return log_log.wide(figure)
    if isinstance(figure, ChancesFigure):
        return chances.wide(figure)
    return counts.wide(figure)


def narrow(figure: Figure) -> Drawing:
    if isinstance(figure, CurvesFigure):
        return curves.narrow(figure)
    if isinstance(figure, BoundaryFigure):
        return boundary.narrow(figure)
    if isinstance(figure, CalendarFigure):
        return calendar.narrow(figure)
    if isinstance(figure, LogLogFigure):
        return log_log.narrow(figure)
    if isinstance(figure, ChancesFigure):
        return chances.narrow(figure)
    return counts.narrow(figure)
