"""Survival curves to read values from, with the numbers at risk following the time axis."""

from __future__ import annotations

from collections.abc import Sequence

from app.render.palette import BAND_OPACITY, HAIRLINE, INK, INK_2, PAPER, arm_ink
from app.render.plotly_figures.setting import (
    FIGURE_SPACE,
    Json,
    Sheet,
    layout,
    row_of_numbers,
    step_line,
    stroke_at,
    words_at,
)
from app.render.svg.curves import (
    BASELINE,
    NARROW_PAGE,
    PERCENT_TICKS,
    ROW_PITCH,
    STROKE,
    STROKE_OFF,
    WIDE_PAGE,
    Page,
    end_labels_at,
    is_upper,
    label_left,
    name_lines,
    row_heights,
    runs_with_limits,
    shown_ticks,
    y_title_at,
)
from app.render.svg.curves import narrow as narrow_drawing
from app.render.svg.curves import wide as wide_drawing
from app.render.svg.geometry import Scale, snapped
from app.render.svg.lettering import SMALL
from app.sheets.blocks import CurveLine, CurvesFigure

WITH_LIMITS = "%{fullData.name}: %{y:.1f}% (%{customdata})"


def wide(figure: CurvesFigure) -> Json:
    return _chart(figure, WIDE_PAGE, wide_drawing(figure).height)


def narrow(figure: CurvesFigure) -> Json:
    return _chart(figure, NARROW_PAGE, narrow_drawing(figure).height)


def _chart(figure: CurvesFigure, page: Page, height: float) -> Json:
    sheet = Sheet(page.width, height, page.plot)
    start, end = figure.ticks[0], figure.ticks[-1]
    x = {"range": [start, end], "tickmode": "array", "tickvals": list(figure.ticks), "hoverformat": ".1f"}
    x["ticktext"] = [f"{tick:g}" for tick in figure.ticks]
    y = {"range": [0, 100], "tickmode": "array", "tickvals": list(PERCENT_TICKS), "fixedrange": False}
    traces = [
        *(band for line in figure.lines for band in _bands(line, end)),
        *(trace for line in figure.lines for trace in _line(line, end)),
        *(_strokes(line, end, upwards=is_upper(line, figure.lines)) for line in figure.lines),
        *_rows(figure, page),
    ]
    half = {"type": "line", "xref": "paper", "x0": 0, "x1": 1, "y0": 50, "y1": 50, "layer": "between"}
    half["line"] = {"color": HAIRLINE, "width": 1}
    shapes = [half, *_samples(figure, page, sheet)]
    setting = layout(sheet, x=x, y=y, notes=_notes(figure, page, sheet), shapes=shapes)
    return {"data": traces, "layout": {**setting, "hovermode": "x unified"}}


def _line(line: CurveLine, end: float) -> list[Json]:
    steps = [
        (t, s, _limits(low, high))
        for t, s, low, high in zip(line.time, line.survival, line.ci_low, line.ci_high, strict=True)
        if t <= end
    ]
    times, survival, limits = (list(values) for values in zip(*steps, strict=True))
    last = line.ends_at(end)
    if times[-1] < last:
        times, survival, limits = [*times, last], [*survival, survival[-1]], [*limits, limits[-1]]
    return step_line(
        times, survival, arm_ink(line.arm), name=line.label, hover=WITH_LIMITS, customdata=limits
    )


def _limits(low: float | None, high: float | None) -> str:
    return "no interval" if low is None or high is None else f"{low:.1f} to {high:.1f}"


def _bands(line: CurveLine, end: float) -> list[Json]:
    """The pointwise interval: an upper edge and a lower one filled up to it, for each stretch with limits."""
    colour = translucent(arm_ink(line.arm).line, BAND_OPACITY)
    edge = {"type": "scatter", "mode": "lines", "line": {"width": 0, "shape": "hv"}, "hoverinfo": "skip"}
    bands: list[Json] = []
    for run in runs_with_limits(line, line.ends_at(end)):
        times = [t for t, _, _ in run]
        bands.append({**edge, "x": times, "y": [high for _, _, high in run]})
        fill = {"fill": "tonexty", "fillcolor": colour}
        bands.append({**edge, "x": times, "y": [low for _, low, _ in run], **fill})
    return bands


def translucent(colour: str, opacity: float) -> str:
    red, green, blue = (int(colour[at : at + 2], 16) for at in (1, 3, 5))
    return f"rgba({red},{green},{blue},{opacity:g})"


def _strokes(line: CurveLine, end: float, *, upwards: bool) -> Json:
    """Censorings, off the line as the drawing has them: above the upper arm, below the lower one."""
    inside = [(t, s) for t, s in line.censored_at if t <= end]
    return {
        "type": "scatter",
        "mode": "markers",
        "x": [t for t, _ in inside],
        "y": [s for _, s in inside],
        "marker": {
            "symbol": "line-ns-open",
            "size": STROKE / 1.4,  # plotly.js draws this symbol 1.4 times its size tall
            "angle": 180 if upwards else 0,  # stands off against this direction
            "standoff": STROKE_OFF + STROKE / 2,
            "color": arm_ink(line.arm).line,
            "line": {"width": 0.75},
        },
        "hoverinfo": "skip",
    }


def _rows(figure: CurvesFigure, page: Page) -> list[Json]:
    scale = Scale(figure.ticks[0], figure.ticks[-1], page.plot.left, page.plot.right)
    shown = shown_ticks(figure, scale)
    ticks = [figure.ticks[index] for index in shown]
    rows = [
        (counts, top + ROW_PITCH * number, number == 0)
        for line, top in zip(figure.lines, row_heights(figure, page), strict=True)
        for number, counts in enumerate((line.rows.at_risk, line.rows.events, line.rows.censored))
    ]
    digits = max(3, *(len(str(count)) for counts, _, _ in rows for count in counts))
    return [
        row_of_numbers(
            ticks,
            [str(counts[index]).rjust(digits, FIGURE_SPACE) for index in shown],
            y,
            colours=[INK] * len(shown),
            semibold=[strong] * len(shown),
        )
        for counts, y, strong in rows
    ]


def _notes(figure: CurvesFigure, page: Page, sheet: Sheet) -> list[Json]:
    below = page.plot.bottom + 20 + (18 if page.name_above else 0)
    return [
        words_at(sheet, figure.y_title, y_title_at(page), 14, size=SMALL),
        words_at(sheet, figure.x_title, 0, below, size=SMALL),
        *_end_labels(figure, page, sheet),
        *(
            note
            for line, y in zip(figure.lines, row_heights(figure, page), strict=True)
            for note in _heads(line, page, sheet, y)
        ),
    ]


def _end_labels(figure: CurvesFigure, page: Page, sheet: Sheet) -> list[Json]:
    return [
        words_at(
            sheet,
            " ".join(name_lines(line, page)),
            label_left(page),
            y,
            colour=arm_ink(line.arm).text,
            semibold=True,
        )
        for line, y in zip(figure.lines, end_labels_at(figure, page), strict=True)
    ]


def _samples(figure: CurvesFigure, page: Page, sheet: Sheet) -> list[Json]:
    """A sample of each line before the name of its arm."""
    above = ROW_PITCH if page.name_above else 0.0
    strokes = (
        (arm_ink(line.arm), snapped(y - above - BASELINE))
        for line, y in zip(figure.lines, row_heights(figure, page), strict=True)
    )
    return [
        stroke_at(sheet, (0, 18), y, colour, width)
        for ink, y in strokes
        for colour, width in (((ink.line, 3.25), (PAPER, 1.75)) if ink.hollow else ((ink.line, 1.75),))
    ]


def _heads(line: CurveLine, page: Page, sheet: Sheet, y: float) -> Sequence[Json]:
    """The arm's name, and the words of its three rows."""
    name_at = y - ROW_PITCH if page.name_above else y
    rows = (
        words_at(
            sheet,
            word,
            page.words_at,
            y + ROW_PITCH * number,
            colour=INK if number == 0 else INK_2,
            semibold=number == 0,
        )
        for number, word in enumerate(page.row_words)
    )
    return [words_at(sheet, line.label, 24, name_at, colour=arm_ink(line.arm).text, semibold=True), *rows]
