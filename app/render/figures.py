"""Which module draws which figure."""

from __future__ import annotations

from app.render.svg import boundary, calendar, counts, curves
from app.render.svg.drawing import Drawing
from app.sheets.blocks import BoundaryFigure, CalendarFigure, CurvesFigure, Figure


def wide(figure: Figure) -> Drawing:
    if isinstance(figure, CurvesFigure):
        return curves.wide(figure)
    if isinstance(figure, BoundaryFigure):
        return boundary.wide(figure)
    if isinstance(figure, CalendarFigure):
        return calendar.wide(figure)
    return counts.wide(figure)


def narrow(figure: Figure) -> Drawing:
    if isinstance(figure, CurvesFigure):
        return curves.narrow(figure)
    if isinstance(figure, BoundaryFigure):
        return boundary.narrow(figure)
    if isinstance(figure, CalendarFigure):
        return calendar.narrow(figure)
    return counts.narrow(figure)
