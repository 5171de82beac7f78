"""Which module draws which figure."""

from __future__ import annotations

from app.render.svg import boundary, calendar, chances, counts, curves, log_log, residuals
from app.render.svg.drawing import Drawing
from app.sheets.blocks import (
    BoundaryFigure,
    CalendarFigure,
    ChancesFigure,
    CurvesFigure,
    Figure,
    LogLogFigure,
    ResidualFigure,
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
    if isinstance(figure, ResidualFigure):
        return residuals.wide(figure)
    if isinstance(figure, ChancesFigure):
        return chances.wide(figure)
    return counts.wide(figure)


def half(figure: Figure) -> Drawing:
    """A figure that stands beside another; only those that may are drawn so."""
    if isinstance(figure, LogLogFigure):
        return log_log.half(figure)
    if isinstance(figure, ResidualFigure):
        return residuals.half(figure)
    raise TypeError(f"a {figure.kind} figure takes the whole width")


def narrow(figure: Figure) -> Drawing:
    if isinstance(figure, CurvesFigure):
        return curves.narrow(figure)
    if isinstance(figure, BoundaryFigure):
        return boundary.narrow(figure)
    if isinstance(figure, CalendarFigure):
        return calendar.narrow(figure)
    if isinstance(figure, LogLogFigure):
        return log_log.narrow(figure)
    if isinstance(figure, ResidualFigure):
        return residuals.narrow(figure)
    if isinstance(figure, ChancesFigure):
        return chances.narrow(figure)
    return counts.narrow(figure)
