"""Subjects and events by date, to read values from."""

from __future__ import annotations

from datetime import timedelta

from app.render.palette import HAIRLINE, INK, INK_2, INK_3, PAPER, POOLED
from app.render.plotly_figures.setting import (
    FIGURE_SPACE,
    Json,
    Sheet,
    layout,
    row_of_numbers,
    step_line,
    words_at,
)
from app.render.svg import calendar as drawing
from app.render.svg.calendar import DASHES, EPOCH, NARROW_PAGE, WIDE_PAGE, Page
from app.render.svg.lettering import LABEL, SMALL
from app.sheets.blocks import CalendarFigure, Series


def wide(figure: CalendarFigure) -> Json:
    return _chart(figure, WIDE_PAGE, drawing.wide(figure).height)


def narrow(figure: CalendarFigure) -> Json:
    return _chart(figure, NARROW_PAGE, drawing.narrow(figure).height)


def iso(day: float) -> str:
    return (EPOCH + timedelta(days=round(day))).isoformat()


def _chart(figure: CalendarFigure, page: Page, height: float) -> Json:
    x_scale, y_scale = drawing.scales(figure, page)
    sheet = Sheet(page.width, height, page.plot)
    ticks = drawing.month_ticks(round(x_scale.low), round(x_scale.high), page.most_ticks)
    x = {"type": "date", "range": [iso(x_scale.low), iso(x_scale.high)], "tickmode": "array"}
    x |= {"tickvals": [tick.isoformat() for tick in ticks], "tickformat": "%b %Y", "hoverformat": "%-d %b %Y"}
    y = {"range": [0, y_scale.high], "rangemode": "nonnegative"}
    traces = [
        *(trace for series in figure.series for trace in _line(series, x_scale.high)),
        *(_discs(figure, series) for series in figure.series),
        *_rows(figure, page),
    ]
    setting = layout(sheet, x=x, y=y, notes=_notes(figure, page, sheet), shapes=_shapes(figure, y_scale.high))
    return {"data": traces, "layout": {**setting, "hovermode": "x unified"}}


def _line(series: Series, last_day: float) -> list[Json]:
    days = [iso(day) for day in (*series.day, last_day)]
    counts = [*series.count, series.count[-1] if series.count else 0]
    traces = step_line(days, counts, POOLED, name=series.label, hover="%{fullData.name}: %{y}")
    if series.style == "dashed":
        traces[0]["line"]["dash"] = ",".join(f"{dash}px" for dash in DASHES.split())
    return traces


def _discs(figure: CalendarFigure, series: Series) -> Json:
    sizes = [9.0] * (len(figure.marks) - 1) + [12.0] * bool(figure.marks)
    return {
        "type": "scatter",
        "mode": "markers",
        "x": [iso(day) for day, _ in figure.marks],
        "y": [drawing.count_on(series, day) for day, _ in figure.marks],
        "marker": {"size": sizes, "color": INK, "opacity": 1, "line": {"color": PAPER, "width": 1.5}},
        "hoverinfo": "skip",
        "cliponaxis": False,
    }


def _shapes(figure: CalendarFigure, top: float) -> list[Json]:
    cutoffs = [
        {
            "type": "line",
            "x0": iso(day),
            "x1": iso(day),
            "y0": 0,
            "y1": top,
            "line": {"color": HAIRLINE, "width": 1},
            "layer": "between",
        }
        for day, _ in figure.marks
    ]
    if figure.planned is None:
        return cutoffs
    level = figure.planned[0]
    dotted = {"color": INK_3, "width": 1, "dash": "1px,3px"}
    return [
        *cutoffs,
        {"type": "line", "xref": "paper", "x0": 0, "x1": 1, "y0": level, "y1": level, "line": dotted},
    ]


def _rows(figure: CalendarFigure, page: Page) -> list[Json]:
    x_scale, _ = drawing.scales(figure, page)
    if not drawing.rows_fit(figure, [x_scale(day) for day, _ in figure.marks]):
        return []
    first = page.plot.bottom + page.rows_apart
    days = [iso(day) for day, _ in figure.marks]
    is_now = [number == len(days) for number in range(1, len(days) + 1)]
    colours = [INK if now else INK_2 for now in is_now]
    rows = [
        row_of_numbers(days, [label for _, label in figure.marks], first, colours=colours, semibold=is_now)
    ]
    for number, series in enumerate(figure.series, start=1):
        counts = [str(drawing.count_on(series, day)).rjust(3, FIGURE_SPACE) for day, _ in figure.marks]
        y = first + drawing.ROW_PITCH * number
        rows.append(row_of_numbers(days, counts, y, colours=colours, semibold=[False] * len(days)))
    return rows


def _notes(figure: CalendarFigure, page: Page, sheet: Sheet) -> list[Json]:
    x_scale, y_scale = drawing.scales(figure, page)
    first = page.plot.bottom + page.rows_apart
    heads = ["Data cutoff", *(series.label for series in figure.series)]
    shown = heads if drawing.rows_fit(figure, [x_scale(day) for day, _ in figure.marks]) else []
    labels = drawing.end_labels(figure, page, y_scale)
    return [
        words_at(sheet, figure.y_title, drawing.y_title_at(page, y_scale), 14, size=SMALL),
        words_at(sheet, "Calendar date", 0, drawing.x_title_y(page), size=SMALL),
        *(
            words_at(sheet, label.text, page.plot.right + 10, label.y, size=LABEL, colour=label.fill)
            for label in labels
        ),
        *(words_at(sheet, head, 0, first + drawing.ROW_PITCH * number) for number, head in enumerate(shown)),
    ]
