"""Strips of probability: one scale, a disc where each stands, numbers in line."""

from __future__ import annotations

from itertools import pairwise
from xml.etree import ElementTree

import pytest

from app.render.page import has_chart
from app.render.plotly_figures import plotly_figure
from app.render.svg import chances
from tests.render import invented_book as invented
from tests.render.drawn_figures import FIGURES, SVG, texts

MASKED = invented.chances_figure("masked")


def discs(svg: str) -> list[tuple[float, float]]:
    """Where the discs in ink stand, by row."""
    circles = ElementTree.fromstring(svg).iter(f"{SVG}circle")
    return [(float(c.get("cx", "")), float(c.get("cy", ""))) for c in circles if c.get("r") == "4.5"]


@pytest.mark.parametrize("drawn", [chances.wide, chances.narrow])
def test_each_chance_is_a_disc_on_one_scale_of_percent(drawn: object) -> None:
    svg = str(drawn(MASKED))  # type: ignore[operator]
    ticks = {text.words: text.x for text in texts(svg) if text.words in ("0", "100")}
    for (x, _), chance in zip(discs(svg), MASKED.chances, strict=True):
        assert chance.percent.value is not None
        assert x == pytest.approx(ticks["0"] + chance.percent.value * (ticks["100"] - ticks["0"]), abs=0.01)


def test_the_readings_of_an_effect_stand_closer_than_effects() -> None:
    heights = [y for _, y in discs(str(chances.wide(MASKED)))]
    steps = [b - a for a, b in pairwise(heights)]
    assert steps == [14, 20, 14, 20, 14]


def test_each_effect_is_named_once_and_each_reading_at_its_strip() -> None:
    said = [text.words for text in texts(str(chances.wide(MASKED)))]
    assert said.count("The trend so far") == 1
    assert said.count("if A") == said.count("if B") == 3


def test_the_limits_of_the_trend_are_said_where_there_is_room() -> None:
    wide, narrow = (
        [text.words for text in texts(str(drawn(MASKED)))] for drawn in (chances.wide, chances.narrow)
    )
    assert "43.4 to 99.1" in wide
    assert "43.4 to 99.1" not in narrow


def test_a_chance_that_is_no_number_is_said_and_has_no_disc() -> None:
    figure = FIGURES["chances without a number"]
    svg = str(chances.wide(figure))  # type: ignore[arg-type]
    assert len(discs(svg)) == 5
    assert "not estimable" in [text.words for text in texts(svg)]


def test_there_is_nothing_to_zoom_into() -> None:
    assert not has_chart(MASKED)
    assert plotly_figure(MASKED) is None
