"""The gauge lying down: the grammar of the lanes, and while masked two readings of one z."""

from __future__ import annotations

import re
from itertools import pairwise

import pytest

from app.render import palette
from app.render.svg import strips
from app.sheets.blocks import ZStrip
from tests.render.drawn_figures import STRIPS, texts


def svg(name: str) -> str:
    strip = STRIPS[name]
    assert isinstance(strip, ZStrip)
    return str(strips.wide(strip))


def bars(drawn: str, colour: str) -> int:
    return len(re.findall(rf'<path [^>]*stroke="{colour}" stroke-width="2.5"', drawn))


def test_harm_has_its_bar_and_its_name() -> None:
    drawn = svg("z strip with harm")
    assert bars(drawn, palette.INK) == 2
    assert "harm\u00a0−2.390" in [text.words for text in texts(drawn)]
    assert palette.CROSSED not in drawn


def test_crossed_harm_colours_its_own_zone_and_bar_and_no_other() -> None:
    drawn = svg("z strip with harm crossed")
    assert (bars(drawn, palette.CROSSED), bars(drawn, palette.INK)) == (1, 1)
    assert drawn.count(palette.CROSSED_ZONE) == 1
    assert re.search(rf'<polygon [^>]*fill="{palette.CROSSED}"', drawn)


def test_crossed_futility_is_an_open_diamond_and_colours_no_bar() -> None:
    """A bound that only advises: no zone in crossed, wherever z stands against the others."""
    drawn = svg("z strip with futility crossed")
    assert re.search(rf'<polygon [^>]*fill="{palette.PAPER}" stroke="{palette.CROSSED}"', drawn)
    assert bars(drawn, palette.CROSSED) == 0
    assert palette.CROSSED_ZONE not in drawn


def test_masked_one_disc_has_two_readings_and_what_is_crossed_shows_in_its_own() -> None:
    drawn = svg("z strip masked with harm crossed")
    said = [text.words for text in texts(drawn)]
    assert "A" in said
    assert "B" in said
    assert (bars(drawn, palette.CROSSED), bars(drawn, palette.INK)) == (1, 3)
    assert drawn.count(palette.CROSSED_ZONE) == 1
    assert "<polygon" not in drawn  # the mark is of both readings, and stays a disc


def test_masked_a_crossing_below_leaves_the_efficacy_bars_in_ink() -> None:
    """z above 0 once coloured the upper bound whatever had been crossed."""
    assert bars(svg("z strip masked"), palette.CROSSED) == 0


@pytest.mark.parametrize("name", [name for name, strip in STRIPS.items() if isinstance(strip, ZStrip)])
def test_names_under_the_strip_keep_off_one_another_and_inside(name: str) -> None:
    drawn = svg(name)
    lowest = max(text.y for text in texts(drawn))
    row = sorted((text for text in texts(drawn) if text.y == lowest), key=lambda text: text.left)
    assert len(row) >= 2
    assert all(a.right + 3 <= b.left for a, b in pairwise(row))
    assert row[0].left >= 0
    assert row[-1].right <= 380.5


def test_masked_the_readings_mirror_each_other() -> None:
    """Every bar of A's reading has its mirror in B's, about z 0: the strip favours neither."""
    drawn = svg("z strip masked with harm crossed")
    placed = [
        (float(x), float(top))
        for x, top in re.findall(r'<path d="M([\d.]+) ([\d.]+)V[\d.]+" stroke="#\w+" stroke-width', drawn)
    ]
    upper, lower = sorted({top for _, top in placed})
    middle = (14.5 + 379.5) / 2
    of_a = sorted(x - middle for x, top in placed if top == upper)
    of_b = sorted(middle - x for x, top in placed if top == lower)
    assert len(of_a) == 3
    assert of_a == pytest.approx(of_b, abs=0.02)
