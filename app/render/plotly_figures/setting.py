"""What every chart shares: faces, axes, words at a place of the drawing, rows of numbers under the axis.

Places are those of the drawing, in its units. The second y axis counts them downwards, so that a row of
numbers is a text trace at the height where the drawing has it, and follows the x axis when that is zoomed.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from html import escape
from typing import Any

from app.render.palette import GRID, INK, INK_2, INK_3, PAPER, ArmInk
from app.render.svg.geometry import Box
from app.render.svg.lettering import LABEL, SMALL

Json = dict[str, Any]
FONT = "'Source Sans 3', 'Helvetica Neue', Arial, sans-serif"
FIGURE_SPACE = "\u2007"
UNDER_AXIS = 28.0  # ticks and their numbers, between the plot and the rows
BASELINE = 4.5
NOTE_EDGE = 2.0  # plotly.js sets words this far inside the box it places
SEMIBOLD = 600


@dataclass(frozen=True)
class Sheet:
    """The paper of a chart: the size of the drawing, and where its plot stands on it."""

    width: float
    height: float
    plot: Box

    @property
    def inner_height(self) -> float:
        return self.height - self.plot.top


def said(text: str) -> str:
    """Plain words for plotly.js, which would read tags in them."""
    return escape(text, quote=False)


def font(size: float = LABEL, colour: str = INK, *, semibold: bool = False) -> Json:
    return {"family": FONT, "size": size, "color": colour, **({"weight": SEMIBOLD} if semibold else {})}


def layout(sheet: Sheet, *, x: Json, y: Json, notes: Sequence[Json], shapes: Sequence[Json] = ()) -> Json:
    """Margins that put the plot where the drawing has it, and under it the rows."""
    plot = sheet.plot
    axis_share = plot.height / sheet.inner_height
    rows_top = plot.bottom + UNDER_AXIS
    return {
        "template": {},
        "margin": {"l": plot.left, "r": sheet.width - plot.right, "t": plot.top, "b": 0, "pad": 0},
        "paper_bgcolor": PAPER,
        "plot_bgcolor": PAPER,
        "font": font(),
        "showlegend": False,
        "dragmode": "zoom",
        "hoverlabel": {"bgcolor": PAPER, "bordercolor": INK_3, "font": font()},
        "modebar": {"bgcolor": PAPER, "color": INK_3, "activecolor": INK},
        "xaxis": {**_axis(), "anchor": "y", "showgrid": False, "ticks": "outside", "ticklen": 5, **x},
        "yaxis": {
            **_axis(),
            "domain": [1 - axis_share, 1],
            "gridcolor": GRID,
            "showline": False,
            "ticks": "",
            "ticklabelstandoff": 7,
            **y,
        },
        "yaxis2": {
            "domain": [0, max(0.0, (sheet.height - rows_top) / sheet.inner_height)],
            "range": [sheet.height, rows_top],
            "anchor": "x",
            "fixedrange": True,
            "visible": False,
        },
        "annotations": list(notes),
        "shapes": list(shapes),
    }


def _axis() -> Json:
    return {
        "showline": True,
        "linecolor": INK_3,
        "tickcolor": INK_3,
        "zeroline": False,
        "tickfont": font(SMALL, INK_2),
    }


def words_at(
    sheet: Sheet,
    text: str,
    x: float,
    y: float,
    *,
    size: float = LABEL,
    colour: str = INK_2,
    semibold: bool = False,
    anchor: str = "left",
) -> Json:
    """Words on the baseline `y` of the drawing, staying there whatever is zoomed."""
    return {
        "text": said(text),
        "xref": "paper",
        "yref": "paper",
        "x": 0,
        "y": 1,
        "xshift": x - sheet.plot.left - NOTE_EDGE,
        "yshift": sheet.plot.top - y + BASELINE + NOTE_EDGE / 2,
        "xanchor": anchor,
        "yanchor": "middle",
        "showarrow": False,
        "font": font(size, colour, semibold=semibold),
    }


def stroke_at(sheet: Sheet, x: tuple[float, float], y: float, colour: str, width: float) -> Json:
    """A stroke across at a place of the drawing, outside the axes too, staying there whatever is zoomed."""
    plot = sheet.plot
    left, right = ((end - plot.left) / plot.width for end in x)
    height = 1 - (y - plot.top) / sheet.inner_height
    ends = {"x0": left, "x1": right, "y0": height, "y1": height}
    line = {"color": colour, "width": width}
    return {"type": "line", "xref": "paper", "yref": "paper", **ends, "line": line}


def row_of_numbers(
    x: Sequence[Any], texts: Sequence[str], y: float, *, colours: Sequence[str], semibold: Sequence[bool]
) -> Json:
    """Numbers under the axis as a text trace, in line under what they belong to."""
    return {
        "type": "scatter",
        "mode": "text",
        "x": list(x),
        "y": [y - BASELINE] * len(texts),
        "yaxis": "y2",
        "text": [said(text) for text in texts],
        "textposition": "middle center",
        "textfont": {**font(), "color": list(colours), "weight": [SEMIBOLD if s else 400 for s in semibold]},
        "hoverinfo": "skip",
        "cliponaxis": False,
    }


def in_line(text: str) -> str:
    """A number padded so that, centred, its point stands where the drawing has it."""
    whole, point, places = text.partition(".")
    if not point:
        return text
    left, right = len(whole), len(places)
    return FIGURE_SPACE * max(0, right - left - 2) + text + FIGURE_SPACE * max(0, left + 2 - right)


def step_line(
    x: Sequence[Any],
    y: Sequence[float],
    ink: ArmInk,
    *,
    name: str,
    hover: str,
    customdata: Sequence[Any] = (),
) -> list[Json]:
    """A step line to read values from; hollow for arm B."""
    line = {"color": ink.line, "width": 3.25 if ink.hollow else 1.75, "shape": "hv"}
    outer = {
        "type": "scatter",
        "mode": "lines",
        "name": said(name),
        "x": list(x),
        "y": list(y),
        "line": line,
        "customdata": list(customdata),
        "hovertemplate": f"{hover}<extra></extra>",
    }
    if not ink.hollow:
        return [outer]
    core = {**outer, "line": {**line, "color": PAPER, "width": 1.25}, "hoverinfo": "skip", "customdata": []}
    core.pop("hovertemplate")
    return [outer, core]
