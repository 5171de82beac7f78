"""The figures to zoom into: plotly.js figures as plain dicts, in the places and faces of the drawings."""

from __future__ import annotations

from app.render.plotly_figures import boundary, calendar, curves, log_log, residuals
from app.render.plotly_figures.setting import Json
from app.sheets.blocks import (
    BoundaryFigure,
    CalendarFigure,
    CurvesFigure,
    Figure,
    LogLogFigure,
    ResidualFigure,
)


def plotly_figure(figure: Figure, *, beside: bool = False) -> Json | None:
    """What figure.json answers: a figure for each width, or None when there is nothing to zoom into.

    Where a figure stands `beside` another, its wide one is half as wide.
    """
    if isinstance(figure, CurvesFigure):
        return {"wide": curves.wide(figure), "narrow": curves.narrow(figure)}
    if isinstance(figure, BoundaryFigure):
        return {"wide": boundary.wide(figure), "narrow": boundary.narrow(figure)}
    if isinstance(figure, CalendarFigure):
        return {"wide": calendar.wide(figure), "narrow": calendar.narrow(figure)}
    if isinstance(figure, LogLogFigure):
        return {"wide": (log_log.half if beside else log_log.wide)(figure), "narrow": log_log.narrow(figure)}
    if isinstance(figure, ResidualFigure):
        return {
            "wide": (residuals.half if beside else residuals.wide)(figure),
            "narrow": residuals.narrow(figure),
        }
    return None
