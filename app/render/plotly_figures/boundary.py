"""The gauges to zoom into: the same lanes, with what each mark and bar stands for under the pointer."""

from __future__ import annotations

from app.render.palette import CROSSED, HAIRLINE, INK, INK_2, INK_3, PAPER
from app.render.plotly_figures.setting import (
    BASELINE,
    NOTE_EDGE,
    Json,
    Sheet,
    font,
    in_line,
    layout,
    row_of_numbers,
    said,
    stroke_at,
    words_at,
)
from app.render.svg import boundary as drawing
from app.render.svg.gauge import (
    ROOM_FOR_LETTERS,
    Bar,
    Zone,
    bars,
    column,
    crosses_a_bar,
    edge_colour,
    lane_readings,
    mark_radius,
    zones,
)
from app.render.svg.geometry import Box
from app.render.svg.lane_plot import (
    NARROW_PAGE,
    WIDE_PAGE,
    LanePage,
    LanePlot,
    lane_plot,
    lower_bound,
    number,
)
from app.render.svg.lane_words import (
    labels_start,
    look_name,
    looks_by_number,
    placed_labels,
    placed_rows,
    row_indent,
)
from app.render.svg.lettering import SMALL, plain
from app.sheets.blocks import BoundaryFigure, Lane, Span


def wide(figure: BoundaryFigure) -> Json:
    return _chart(lane_plot(figure, WIDE_PAGE), WIDE_PAGE, drawing.wide(figure).height)


def narrow(figure: BoundaryFigure) -> Json:
    return _chart(lane_plot(figure, NARROW_PAGE), NARROW_PAGE, drawing.narrow(figure).height)


def _chart(plot: LanePlot, page: LanePage, height: float) -> Json:
    sheet = Sheet(page.width, height, plot.area)
    ticks = drawing.z_ticks(plot.y.low, plot.y.high)
    x = {"range": [plot.x.inverse(plot.area.left), plot.x.inverse(plot.area.right)], "tickmode": "array"}
    x |= {
        "tickvals": [lane.fraction for lane in plot.figure.lanes],
        "ticktext": [said(look_name(plot, lane)) for lane in plot.figure.lanes],
        "hoverformat": ".3f",
    }
    y = {"range": [plot.y.low, plot.y.high], "tickmode": "array", "tickvals": list(ticks)}
    y["ticktext"] = [drawing.signed(tick) for tick in ticks]
    traces = [*_bounds(plot), *_marks(plot), *_rows(plot)]
    setting = layout(sheet, x=x, y=y, notes=_notes(plot, sheet), shapes=_shapes(plot, sheet))
    return {"data": traces, "layout": {**setting, "hovermode": "closest"}}


# --- lanes as shapes ----------------------------------------------------------------------------------------


def _shapes(plot: LanePlot, sheet: Sheet) -> list[Json]:
    zero = {"type": "line", "xref": "paper", "x0": 0, "x1": 1, "y0": 0, "y1": 0, "layer": "between"}
    zero["line"] = {"color": HAIRLINE, "width": 1}
    lanes = (shape for lane in plot.figure.lanes for shape in _lane_shapes(plot, lane))
    return [zero, *_guides(plot), *lanes, *_rules(plot, sheet)]


def _guides(plot: LanePlot) -> list[Json]:
    """The dotted guides between looks, under the lanes."""
    dotted = {"color": INK_3, "width": 1, "dash": "1px,3px"}
    paths = (
        "M " + " L ".join(f"{plot.x.inverse(x):.6f} {plot.y.inverse(y):.6f}" for x, y in guide)
        for guide in drawing.guides(plot)
    )
    return [{"type": "path", "path": path, "line": dotted, "layer": "between"} for path in paths]


def _rules(plot: LanePlot, sheet: Sheet) -> list[Json]:
    """The hairlines over rows that a rule sets apart."""
    return [
        stroke_at(sheet, (0, plot.page.width), placed.y - 20, HAIRLINE, 1)
        for placed in placed_rows(plot)
        if placed.row.rule_above
    ]


def _lane_shapes(plot: LanePlot, lane: Lane) -> list[Json]:
    readings = lane_readings(plot, lane)
    return [
        _rectangle(plot, column(plot, lane), PAPER),
        *(_zone(plot, zone) for reading in readings for zone in zones(plot, lane, reading)),
        *(_rectangle(plot, reading.box, "rgba(0,0,0,0)", edge_colour(lane)) for reading in readings),
        *(_bar(plot, bar) for reading in readings for bar in bars(plot, lane, reading)),
        *_level(plot, lane),
    ]


def _level(plot: LanePlot, lane: Lane) -> list[Json]:
    """Masked, a hairline through both readings at the height of z."""
    z, across = number(lane.z), column(plot, lane)
    if z is None or not plot.is_masked:
        return []
    return [_bar(plot, Bar(across.left, across.right, plot.y(z), INK, 1.0, dashed=False))]


def _rectangle(plot: LanePlot, box: Box, fill: str, edge: str | None = None) -> Json:
    line = {"color": edge, "width": 1} if edge else {"width": 0}
    return {"type": "rect", **_corners(plot, box), "fillcolor": fill, "line": line, "layer": "between"}


def _corners(plot: LanePlot, box: Box) -> Json:
    return {
        "x0": plot.x.inverse(box.left),
        "x1": plot.x.inverse(box.right),
        "y0": plot.y.inverse(box.bottom),
        "y1": plot.y.inverse(box.top),
    }


def _zone(plot: LanePlot, zone: Zone) -> Json:
    if not zone.hatched:
        return _rectangle(plot, zone.box, zone.colour)
    path = " ".join(
        f"M {plot.x.inverse(a):.6f} {plot.y.inverse(b):.6f} L {plot.x.inverse(c):.6f} {plot.y.inverse(d):.6f}"
        for a, b, c, d in zone.segments
    )
    return {
        "type": "path",
        "path": path or "M 0 0",
        "line": {"color": zone.colour, "width": 1},
        "layer": "between",
    }


def _bar(plot: LanePlot, bar: Bar) -> Json:
    line = {"color": bar.colour, "width": bar.width, "dash": "3px,2px" if bar.dashed else "solid"}
    box = Box(bar.left, bar.y, bar.right, bar.y)
    return {"type": "line", **_corners(plot, box), "line": line, "layer": "between"}


# --- what can be read ---------------------------------------------------------------------------------------


def _bounds(plot: LanePlot) -> list[Json]:
    """The bounds as points that are not seen but answer the pointer."""
    if_a = ", if A" if plot.is_masked else ""
    of_kind = (
        (
            "efficacy bound" if not plot.is_two_sided else "bound",
            [(lane, lane.upper, number(lane.upper)) for lane in plot.figure.lanes],
        ),
        (
            "bound" if plot.is_two_sided else "efficacy bound",
            [(lane, lane.lower, lower_bound(lane)) for lane in plot.figure.lanes],
        ),
        (
            f"futility bound{if_a}",
            [(lane, lane.futility, number(lane.futility)) for lane in plot.figure.lanes],
        ),
        (f"harm bound{if_a}", [(lane, lane.harm, number(lane.harm)) for lane in plot.figure.lanes]),
        *_mirrored(plot),
    )
    return [
        _bound_trace(plot, name, points) for name, points in of_kind if any(z is not None for *_, z in points)
    ]


def _mirrored(plot: LanePlot) -> list[tuple[str, list[tuple[Lane, Span | None, float | None]]]]:
    """Masked, futility and harm of the right lanes, which are read upside down."""
    if not plot.is_masked:
        return []
    kinds = (
        ("futility bound, if B", [(lane, lane.futility) for lane in plot.figure.lanes]),
        ("harm bound, if B", [(lane, lane.harm) for lane in plot.figure.lanes]),
    )
    return [
        (name, [(lane, span, None if (z := number(span)) is None else -z) for lane, span in pairs])
        for name, pairs in kinds
    ]


def _bound_trace(plot: LanePlot, name: str, points: list[tuple[Lane, Span | None, float | None]]) -> Json:
    known = [(lane, span, z) for lane, span, z in points if span is not None and z is not None]
    return {
        "type": "scatter",
        "mode": "markers",
        "x": [lane.fraction for lane, _, _ in known],
        "y": [z for _, _, z in known],
        "text": [said(f"Look {lane.look}: {name} {span.text}") for lane, span, _ in known],
        "hovertemplate": "%{text}<extra></extra>",
        "marker": {"size": plot.lane_width, "opacity": 0, "color": INK},
    }


def _marks(plot: LanePlot) -> list[Json]:
    held = [(lane, z) for lane in plot.figure.lanes if (z := number(lane.z)) is not None]
    return [
        {
            "type": "scatter",
            "mode": "markers",
            "x": [lane.fraction for lane, _ in held],
            "y": [z for _, z in held],
            "text": [said(f"Look {lane.look}: z {lane.z.text}") for lane, _ in held if lane.z],
            "hovertemplate": "%{text}, information %{x:.3f}<extra></extra>",
            "marker": {
                "size": [2 * mark_radius(plot, lane) for lane, _ in held],
                "symbol": [_symbol(plot, lane) for lane, _ in held],
                "color": [CROSSED if _is_marked(plot, lane) else INK for lane, _ in held],
                "line": {"color": PAPER, "width": 1.5},
                "opacity": 1,
            },
            "cliponaxis": False,
        }
    ]


def _is_marked(plot: LanePlot, lane: Lane) -> bool:
    return lane.crossed and not plot.is_masked


def _symbol(plot: LanePlot, lane: Lane) -> str:
    if not _is_marked(plot, lane):
        return "circle"
    return "diamond" if crosses_a_bar(plot, lane) else "diamond-open"


def _rows(plot: LanePlot) -> list[Json]:
    traces = []
    for placed in placed_rows(plot):
        pairs = [(lane, cell) for lane, cell in zip(plot.figure.lanes, placed.row.cells, strict=True) if cell]
        traces.append(
            row_of_numbers(
                [lane.fraction for lane, _ in pairs],
                [in_line(cell.text) for _, cell in pairs],
                placed.y,
                colours=[INK if lane.state == "now" else INK_2 for lane, _ in pairs],
                semibold=[cell.tone == "strong" for _, cell in pairs],
            )
        )
    return traces


def _letters(plot: LanePlot, sheet: Sheet) -> list[Json]:
    """A and B over the two lanes of a look, following the axis when it is zoomed."""
    if not plot.is_masked or plot.lane_width < ROOM_FOR_LETTERS:
        return []
    return [
        words_at(
            sheet,
            letter,
            sheet.plot.left + side * plot.lane_width / 4 + NOTE_EDGE,
            sheet.plot.top - 6,
            colour=INK,
        )
        | {"xref": "x", "x": lane.fraction, "xanchor": "center"}
        for lane in plot.figure.lanes
        for letter, side in (("A", -1), ("B", 1))
    ]


def _labels(plot: LanePlot, lane: Lane) -> list[Json]:
    """The words beside a lane, following the axes when they are zoomed."""
    edge = plot.right_of(lane)
    return [
        {
            "text": said(plain(line)),
            "x": plot.x.inverse(edge),
            "y": plot.y.inverse(middle),
            "xshift": labels_start(plot, lane) - edge,
            "xanchor": "left",
            "yanchor": "middle",
            "showarrow": False,
            "borderpad": 0,
            "bgcolor": PAPER,
            "font": font(colour=label.fill, semibold=label.semibold),
        }
        for label, line, middle in placed_labels(plot, lane)
    ]


def _direction(plot: LanePlot, sheet: Sheet) -> list[Json]:
    """What up and down mean, astride the zero line wherever zooming puts it."""
    zero = plot.y(0)
    return [
        words_at(sheet, text, x, y, size=SMALL)
        | {"yref": "y", "y": 0, "yshift": zero - y + BASELINE + NOTE_EDGE / 2}
        for text, x, y in drawing.direction_at(plot)
    ]


def _notes(plot: LanePlot, sheet: Sheet) -> list[Json]:
    """The words of the drawing that are not numbers: what the axis is, what up means, what each row is."""
    title = plain(drawing.axis_title(plot))
    head = [words_at(sheet, "Look", 0, plot.area.bottom + 20)] if looks_by_number(plot) else []
    return [
        words_at(sheet, title, drawing.title_at(plot), 14, size=SMALL),
        *_direction(plot, sheet),
        *head,
        *(note for lane in plot.figure.lanes for note in _labels(plot, lane)),
        *_letters(plot, sheet),
        *(
            words_at(sheet, plain(placed.head), row_indent(plot, placed.row), placed.y)
            for placed in placed_rows(plot)
        ),
    ]
