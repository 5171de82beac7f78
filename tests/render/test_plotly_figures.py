"""Charts to zoom into: plain JSON, no markup in words, in the places of the drawings."""

from __future__ import annotations

import json
import math
import re
from typing import Any

import pytest
from plotly.graph_objects import Figure as PlotlyFigure

from app.render import figures, palette
from app.render.plotly_figures import plotly_figure
from app.render.plotly_figures.setting import in_line
from app.render.svg.boundary import direction_at
from app.render.svg.lane_plot import NARROW_PAGE, WIDE_PAGE, lane_plot
from app.render.svg.panel import HALF_PAGE
from app.sheets.blocks import (
    BoundaryFigure,
    CalendarFigure,
    CurvesFigure,
    Figure,
    LogLogFigure,
    ResidualFigure,
)
from tests.render import invented_book as invented
from tests.render.drawn_figures import FIGURES, HALVES, HARM

HEIGHTS: dict[type, dict[str, float]] = {
    CurvesFigure: {"wide": 250, "narrow": 200},
    CalendarFigure: {"wide": 250, "narrow": 200},
    LogLogFigure: {"wide": 320, "narrow": 220},
    ResidualFigure: {"wide": 320, "narrow": 220},
}
CHARTS = {name: plotly_figure(figure) for name, figure in FIGURES.items()}
every_chart = pytest.mark.parametrize("name", [name for name, chart in CHARTS.items() if chart is not None])


def tall(figure: Figure, page: str) -> float:
    """How tall the drawing has its plot; lanes give room to rows."""
    if isinstance(figure, BoundaryFigure):
        return lane_plot(figure, WIDE_PAGE if page == "wide" else NARROW_PAGE).area.height
    return HEIGHTS[type(figure)][page]


def strings(part: Any) -> list[str]:
    if isinstance(part, str):
        return [part]
    children = part.values() if isinstance(part, dict) else part if isinstance(part, list) else ()
    return [text for child in children for text in strings(child)]


def test_counts_have_no_chart() -> None:
    assert CHARTS["counts"] is None


@every_chart
def test_a_chart_is_plain_json(name: str) -> None:
    text = json.dumps(CHARTS[name], allow_nan=False)
    assert json.loads(text) == CHARTS[name]
    assert text == json.dumps(plotly_figure(FIGURES[name]), allow_nan=False)


@every_chart
@pytest.mark.parametrize("page", ["wide", "narrow"])
def test_plotly_knows_every_name_that_a_chart_uses(name: str, page: str) -> None:
    """The library's own schema refuses a key or a value that the page's script passes over in silence."""
    chart = CHARTS[name]
    assert chart is not None
    part = {key: value for key, value in chart[page].items() if key in ("data", "layout")}
    known = PlotlyFigure(part, skip_invalid=False)
    assert len(known.data) == len(part["data"])


def test_plotly_refuses_a_name_it_does_not_know() -> None:
    with pytest.raises(ValueError, match="Invalid property"):
        PlotlyFigure({"data": [{"type": "scatter", "lines": {}}]}, skip_invalid=False)


@every_chart
def test_no_word_of_a_chart_is_markup(name: str) -> None:
    """plotly.js sets tags with inline styles, which the pages forbid; <extra></extra> it takes out itself."""
    allowed = ("<extra></extra>",)
    found = [text for text in strings(CHARTS[name]) if re.search(r"<(?!extra>|/extra>)", text)]
    assert found == []
    assert all(text.count("<") == 2 for text in strings(CHARTS[name]) if allowed[0] in text)


@every_chart
@pytest.mark.parametrize("page", ["wide", "narrow"])
def test_a_chart_brings_its_own_plain_look_and_fits_the_drawing(name: str, page: str) -> None:
    chart = CHARTS[name]
    assert chart is not None
    layout = chart[page]["layout"]
    drawing = getattr(figures, page)(FIGURES[name])
    assert layout["template"] == {}
    assert layout["margin"]["l"] + layout["margin"]["r"] < drawing.width
    plot = layout["yaxis"]["domain"][1] - layout["yaxis"]["domain"][0]
    assert 0 <= layout["yaxis2"]["domain"][1] < layout["yaxis"]["domain"][0] < 1
    assert plot * (drawing.height - layout["margin"]["t"]) == pytest.approx(tall(FIGURES[name], page), abs=9)


def test_rows_at_risk_are_text_under_the_axis_that_they_follow() -> None:
    chart = CHARTS["curves"]
    assert chart is not None
    rows = [trace for trace in chart["wide"]["data"] if trace["mode"] == "text"]
    assert len(rows) == 6
    figure = invented.curves_figure()
    for row, counts in zip(
        rows[:3], (figure.lines[0].rows.at_risk, figure.lines[0].rows.events), strict=False
    ):
        assert row["x"] == list(figure.ticks)
        assert row["yaxis"] == "y2"
        assert "xaxis" not in row  # that is, the one of the curves
        assert [int(text) for text in row["text"]] == list(counts)
        assert {len(text) for text in row["text"]} == {3}


def test_a_curve_can_be_read_at_each_step_with_its_limits() -> None:
    chart = CHARTS["curves"]
    assert chart is not None
    line = invented.curves_figure().lines[0]
    trace = next(t for t in chart["wide"]["data"] if t.get("name") == line.label)
    assert trace["line"]["shape"] == "hv"
    assert trace["y"][: len(line.survival)] == list(line.survival)
    assert trace["customdata"][1] == f"{line.ci_low[1]:.1f} to {line.ci_high[1]:.1f}"


def test_marks_and_bounds_answer_the_pointer_with_their_own_words() -> None:
    chart = CHARTS["boundary"]
    assert chart is not None
    said = strings(chart["wide"]["data"])
    for words in ("Look 3: z 2.129", "Look 3: efficacy bound 2.434", "Look 3: futility bound 0.958"):
        assert words in said


@pytest.mark.parametrize("name", HALVES)
def test_beside_another_a_chart_takes_the_place_of_the_half_drawing(name: str) -> None:
    chart = plotly_figure(FIGURES[name], beside=True)
    assert chart is not None
    assert chart["narrow"] == plotly_figure(FIGURES[name])["narrow"]  # type: ignore[index]
    layout, drawing = chart["wide"]["layout"], figures.half(FIGURES[name])
    assert len(PlotlyFigure(chart["wide"], skip_invalid=False).data) == len(chart["wide"]["data"])
    width = drawing.width - layout["margin"]["l"] - layout["margin"]["r"]
    assert width == HALF_PAGE.plot.width
    plot = layout["yaxis"]["domain"][1] - layout["yaxis"]["domain"][0]
    assert plot * (drawing.height - layout["margin"]["t"]) == pytest.approx(HALF_PAGE.plot.height)


def test_every_event_and_the_ratio_at_each_place_of_the_smooth_can_be_read() -> None:
    figure, chart = FIGURES["residuals"], CHARTS["residuals"]
    assert isinstance(figure, ResidualFigure)
    assert chart is not None
    band, marks, smooth = chart["wide"]["data"]
    assert list(zip(marks["x"], marks["y"], strict=True)) == list(figure.points)
    assert band["y"] == [p.high for p in figure.smooth] + [p.low for p in reversed(figure.smooth)]
    assert smooth["customdata"][3] == pytest.approx(
        [math.exp(each) for each in (figure.smooth[3].log_ratio, figure.smooth[3].low, figure.smooth[3].high)]
    )
    one, constant = chart["wide"]["layout"]["shapes"]
    assert (one["y0"], constant["y0"]) == (0.0, figure.constant)
    said = [note["text"] for note in chart["wide"]["layout"]["annotations"]]
    assert {"smooth", "constant", "0.804", "↑ favours placebo", "↓ favours tablet"} <= set(said)


@pytest.mark.parametrize(
    ("text", "padded"),
    [
        ("0.714", "0.714"),
        ("−0.770", "−0.770\u2007"),
        ("0.0000138", "\u2007" * 4 + "0.0000138"),
        ("538", "538"),
    ],
)
def test_a_number_is_padded_so_that_its_point_stays_in_line(text: str, padded: str) -> None:
    assert in_line(text) == padded


# --- as near to the drawing as a chart can be -------------------------------------------------------------


def shapes(name: str) -> list[dict[str, Any]]:
    chart = CHARTS[name]
    assert chart is not None
    found: list[dict[str, Any]] = chart["wide"]["layout"]["shapes"]
    return found


def notes(name: str) -> dict[str, dict[str, Any]]:
    chart = CHARTS[name]
    assert chart is not None
    return {note["text"]: note for note in chart["wide"]["layout"]["annotations"]}


def test_guides_join_the_bounds_under_the_lanes() -> None:
    drawn = shapes("boundary with harm")
    guides = [index for index, shape in enumerate(drawn) if shape["line"].get("dash") == "1px,3px"]
    lanes = [index for index, shape in enumerate(drawn) if shape["type"] == "rect"]
    assert len(guides) == 3
    assert max(guides) < min(lanes)
    assert [place.split()[-1] for place in drawn[guides[-1]]["path"].split(" L ")] == [
        f"{z:.6f}" for z in HARM
    ]


def test_the_words_beside_a_lane_stand_at_their_bound_and_follow_it() -> None:
    said = notes("boundary")
    for words, z in (
        ("efficacy\u00a02.434", 2.434),
        ("futility\u00a00.958", 0.958),
        ("needed\u00a02.005", 2.005),
    ):
        assert said[words]["y"] == pytest.approx(z, abs=0.4)  # labels are kept apart
        assert "yref" not in said[words]  # that is, the axis of z
        plot = lane_plot(invented.boundary_figure("not crossed"), WIDE_PAGE)
        edges = [plot.x.inverse(plot.right_of(lane)) for lane in plot.figure.lanes]
        assert said[words]["x"] in edges
        assert said[words]["xshift"] == 7
    assert said["z\u00a02.129"]["font"]["weight"] == 600


def test_what_up_means_stands_where_the_drawing_has_it() -> None:
    plot = lane_plot(invented.boundary_figure("not crossed"), WIDE_PAGE)
    (place,) = [(x, y) for text, x, y in direction_at(plot) if text.startswith("↑")]
    note = notes("boundary")["↑ favours tablet"]
    assert note["xshift"] + plot.area.left == pytest.approx(place[0] - 2)
    assert (note["yref"], note["y"]) == ("y", 0)
    assert plot.y(0) - note["yshift"] == pytest.approx(place[1], abs=6)


def test_masked_both_readings_of_harm_answer_the_pointer() -> None:
    chart = CHARTS["boundary masked with harm"]
    assert chart is not None
    said = strings(chart["wide"]["data"])
    assert "Look 3: harm bound, if A −2.390" in said
    assert "Look 3: harm bound, if B −2.390" in said
    heights = {trace["y"][2] for trace in chart["wide"]["data"] if "harm" in str(trace["text"])}
    assert heights == {-2.390, 2.390}


def test_each_arm_has_a_sample_of_its_line_before_its_name() -> None:
    samples = [shape for shape in shapes("curves") if shape.get("yref") == "paper"]
    expected = []
    for line in invented.curves_figure().lines:
        ink = palette.arm_ink(line.arm)
        expected += [ink.line, palette.PAPER] if ink.hollow else [ink.line]
    assert [shape["line"]["color"] for shape in samples] == expected
    assert len(samples) == 3
    assert all(shape["x0"] < shape["x1"] < 0 for shape in samples)


def test_censorings_stand_off_their_line_away_from_the_other_arm() -> None:
    chart = CHARTS["curves"]
    assert chart is not None
    strokes = [t for t in chart["wide"]["data"] if t.get("marker", {}).get("symbol") == "line-ns-open"]
    lines = invented.curves_figure().lines
    upper = max(range(2), key=lambda index: lines[index].survival[-1])
    assert [trace["marker"]["angle"] for trace in strokes] == [
        180 if index == upper else 0 for index in range(2)
    ]
    assert all(trace["marker"]["standoff"] > 3 for trace in strokes)
