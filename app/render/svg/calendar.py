"""Subjects and events by calendar date, with the counts at each data cutoff in rows under the axis."""

from __future__ import annotations

import itertools
from bisect import bisect_right
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date, timedelta

from app.render.palette import HAIRLINE, INK, INK_2, INK_3, PAPER
from app.render.svg.drawing import (
    NARROW,
    WIDE,
    Drawing,
    axis_line,
    disc,
    ground,
    horizontal,
    small_print,
    ticks_below,
    vertical,
)
from app.render.svg.element import Element, element
from app.render.svg.geometry import WHOLE_STEPS, Box, Scale, apart_within, round_ticks, step_path, thinned
from app.render.svg.lettering import LABEL, SMALL, shortened, text_width, words
from app.sheets.blocks import CalendarFigure, Series

EPOCH = date(1970, 1, 1)
DASHES = "5 3"
FINEST = 0.25
LABEL_GAP = 16.0
BASELINE = 4.5
ROW_PITCH = 16.0
UNITS_AT = 10.0
MONTH_STEPS = (1, 2, 3, 6, 12, 24, 60)
LONGEST_HEADROOM = 0.06


@dataclass(frozen=True)
class Page:
    width: float
    plot: Box
    numbers_end: float
    most_ticks: int
    rows_apart: float  # from the axis down to the first row


WIDE_PAGE = Page(WIDE, Box(176, 26.5, 648, 276.5), 167, 7, 44.5)
NARROW_PAGE = Page(NARROW, Box(62, 26.5, 262, 226.5), 53, 4, 62.5)


def wide(figure: CalendarFigure) -> Drawing:
    return _drawn(figure, WIDE_PAGE)


def narrow(figure: CalendarFigure) -> Drawing:
    return _drawn(figure, NARROW_PAGE)


def _drawn(figure: CalendarFigure, page: Page) -> Drawing:
    x, y = scales(figure, page)
    rows, height = _rows(figure, page, x)
    return Drawing(
        page.width,
        height,
        figure.title,
        figure.description,
        (
            *_count_axis(figure, page, y),
            *_planned(figure, page, y),
            *(vertical(x(day), page.plot.top, page.plot.bottom, HAIRLINE) for day, _ in figure.marks),
            *(_line(series, x, y) for series in figure.series),
            *_discs(figure, x, y),
            *_date_axis(page, x),
            *(part for label in end_labels(figure, page, y) for part in _drawn_label(label, page)),
            *rows,
        ),
    )


# --- scales and dates -------------------------------------------------------------------------------------


def scales(figure: CalendarFigure, page: Page) -> tuple[Scale, Scale]:
    days = [day for series in figure.series for day in series.day] + [day for day, _ in figure.marks]
    first, last = min(days, default=0), max(days, default=1)
    counts = [float(series.count[-1]) for series in figure.series if series.count]
    top = max([1.0, *counts, *([figure.planned[0]] if figure.planned else [])])
    x = Scale(first, max(last, first + 1), page.plot.left, page.plot.right)
    return x, Scale(0, top * (1 + LONGEST_HEADROOM), page.plot.bottom, page.plot.top)


def month_ticks(first: int, last: int, most: int) -> tuple[date, ...]:
    """First days of months inside the days `first`-`last`, evenly apart, at most `most` of them."""
    start, end = EPOCH + timedelta(days=first), EPOCH + timedelta(days=last)
    from_month = start.year * 12 + start.month - 1 + (start.day > 1)
    to_month = end.year * 12 + end.month - 1
    step = next((s for s in MONTH_STEPS if (to_month - from_month) // s + 1 <= most), MONTH_STEPS[-1])
    begin = -(-from_month // step) * step
    return tuple(date(month // 12, month % 12 + 1, 1) for month in range(begin, to_month + 1, step))


def day_number(day: date) -> int:
    return (day - EPOCH).days


def count_on(series: Series, day: int) -> int:
    """The cumulative count at the end of `day`."""
    index = bisect_right(series.day, day)
    return series.count[index - 1] if index else 0


# --- axes -------------------------------------------------------------------------------------------------


def _count_axis(figure: CalendarFigure, page: Page, y: Scale) -> tuple[Element, ...]:
    ticks = count_ticks(y)
    grid = (horizontal(y(tick), page.plot.left, page.plot.right) for tick in ticks[1:])
    numbers = (small_print(f"{tick:g}", page.numbers_end, y(tick) + 4, "end") for tick in ticks)
    return (small_print(figure.y_title, y_title_at(page, y), 14), *grid, *numbers)


def count_ticks(y: Scale) -> tuple[float, ...]:
    return round_ticks(0, y.high, 5, WHOLE_STEPS)


def y_title_at(page: Page, y: Scale) -> float:
    """Over the axis, where its numbers begin."""
    return page.numbers_end - text_width(f"{count_ticks(y)[-1]:g}", SMALL)


def x_title_y(page: Page) -> float:
    return page.plot.bottom + (20 if page.width == WIDE else 38)


def _planned(figure: CalendarFigure, page: Page, y: Scale) -> tuple[Element, ...]:
    """The planned number, a dotted level across the plot; its words stand among the labels at the right."""
    if figure.planned is None:
        return ()
    level = y(figure.planned[0])
    path = f"M{page.plot.left:g} {level:.2f}H{page.plot.right:g}"
    return (element("path", d=path, fill="none", stroke=INK_3, stroke_dasharray="1 3"),)


def _date_axis(page: Page, x: Scale) -> tuple[Element, ...]:
    below = page.plot.bottom + 20
    ticks = month_ticks(round(x.low), round(x.high), page.most_ticks)
    places = [x(day_number(tick)) for tick in ticks]
    return (
        axis_line(page.plot.bottom, page.plot.left, page.plot.right),
        ticks_below(page.plot.bottom, places),
        *(
            small_print(f"{tick:%b}\u00a0{tick.year}", at, below, "middle")
            for tick, at in zip(ticks, places, strict=True)
        ),
        small_print("Calendar date", 0, x_title_y(page)),
    )


# --- lines and labels ---------------------------------------------------------------------------------------


def _line(series: Series, x: Scale, y: Scale) -> Element:
    points = [
        (x.start, y(0)),
        *((x(day), y(count)) for day, count in zip(series.day, series.count, strict=True)),
    ]
    points.append((x.end, points[-1][1]))
    return element(
        "path",
        d=step_path(thinned(points, FINEST)),
        fill="none",
        stroke=INK,
        stroke_width=1.75,
        stroke_dasharray=DASHES if series.style == "dashed" else None,
    )


def _discs(figure: CalendarFigure, x: Scale, y: Scale) -> tuple[Element, ...]:
    """Where each line stood at each cutoff; the last one is now and larger, as on the spine."""
    parts: list[Element] = []
    for series in figure.series:
        for number, (day, _) in enumerate(figure.marks, start=1):
            at, level = x(day), y(count_on(series, day))
            radius = 4.5 if number == len(figure.marks) else 3.0
            parts += [disc(at, level, radius + 1.5, PAPER), disc(at, level, radius, INK)]
    return tuple(parts)


@dataclass(frozen=True)
class EndLabel:
    """What stands right of the plot, on the baseline `y`."""

    text: str
    y: float
    fill: str


def end_labels(figure: CalendarFigure, page: Page, y: Scale) -> tuple[EndLabel, ...]:
    """What each line counts, at its end, and the planned number at its level; kept apart."""
    named = [(y(series.count[-1] if series.count else 0), series.label, INK) for series in figure.series]
    if figure.planned is not None:
        named.append((y(figure.planned[0]), figure.planned[1], INK_2))
    placed = apart_within([at for at, _, _ in named], LABEL_GAP, page.plot.top, page.plot.bottom - 6)
    room = page.width - page.plot.right - 10
    return tuple(
        EndLabel(shortened(text, room), middle + BASELINE, fill)
        for (_, text, fill), middle in zip(named, placed, strict=True)
    )


def _drawn_label(label: EndLabel, page: Page) -> tuple[Element, Element]:
    left = page.plot.right + 10
    return ground(left, label.y, text_width(label.text)), words(label.text, left, label.y, fill=label.fill)


# --- rows -------------------------------------------------------------------------------------------------


def _rows(figure: CalendarFigure, page: Page, x: Scale) -> tuple[tuple[Element, ...], float]:
    """The cutoffs by name, then each series' count there, digits in line under the cutoff."""
    y = page.plot.bottom + page.rows_apart
    places = [x(day) for day, _ in figure.marks]
    if not places or not rows_fit(figure, places):
        return (), y - ROW_PITCH
    parts = [words("Data cutoff", 0, y, fill=INK_2), *_mark_names(figure.marks, places, page, y)]
    for series in figure.series:
        y += ROW_PITCH
        parts.append(words(series.label, 0, y, fill=INK_2))
        for number, ((day, _), at) in enumerate(zip(figure.marks, places, strict=True), start=1):
            fill = INK if number == len(places) else INK_2
            parts.append(words(str(count_on(series, day)), at + UNITS_AT, y, fill=fill, anchor="end"))
    return tuple(parts), y + 4.5


def _mark_names(
    marks: Sequence[tuple[int, str]], places: Sequence[float], page: Page, y: float
) -> list[Element]:
    named = []
    for number, ((_, label), at) in enumerate(zip(marks, places, strict=True), start=1):
        is_now = number == len(marks)
        half = text_width(label, LABEL, semibold=is_now) / 2
        middle = min(at, page.width - half)
        named.append(words(label, middle, y, fill=INK if is_now else INK_2, anchor="middle", semibold=is_now))
    return named


def rows_fit(figure: CalendarFigure, places: Sequence[float]) -> bool:
    halves = [text_width(label, LABEL, semibold=True) / 2 for _, label in figure.marks]
    reach = [(text_width("Data cutoff") + 5, 0.0), *zip(places, halves, strict=True)]
    return all(a + half_a + 6 <= b - half_b for (a, half_a), (b, half_b) in itertools.pairwise(reach))
