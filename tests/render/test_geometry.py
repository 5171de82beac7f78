"""Where things go: scales, ticks, labels that keep apart, hatching, step lines."""

from __future__ import annotations

from itertools import pairwise

import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.render.svg.geometry import (
    Box,
    Scale,
    apart_within,
    hatching,
    kept_apart,
    round_ticks,
    snapped,
    step_path,
    thinned,
)

places = st.lists(st.floats(-500, 500, allow_nan=False), min_size=1, max_size=12)


def test_a_scale_maps_its_ends_and_back() -> None:
    scale = Scale(0, 100, 276.5, 26.5)
    assert (scale(0), scale(50), scale(100)) == (276.5, 151.5, 26.5)
    assert scale.inverse(scale(37.25)) == pytest.approx(37.25, abs=1e-12)


def test_hairlines_fall_on_half_units() -> None:
    assert [snapped(place) for place in (0.0, 3.2, 3.9, -0.4)] == [0.5, 3.5, 3.5, -0.5]


@pytest.mark.parametrize(
    ("low", "high", "most", "ticks"),
    [
        (-1.67, 4.69, 7, (-1, 0, 1, 2, 3, 4)),
        (-4.69, 4.69, 7, (-4, -2, 0, 2, 4)),
        (0, 100, 4, (0, 25, 50, 75, 100)),
        (0, 0.3, 3, (0, 0.1, 0.2, 0.3)),
    ],
)
def test_ticks_are_round(low: float, high: float, most: int, ticks: tuple[float, ...]) -> None:
    assert round_ticks(low, high, most) == pytest.approx(ticks)


@given(st.floats(-1e6, 1e6), st.floats(1e-3, 1e6), st.integers(1, 12))
def test_ticks_lie_inside_and_are_no_more_than_asked(low: float, span: float, most: int) -> None:
    ticks = round_ticks(low, low + span, most)
    assert len(ticks) <= most + 1
    assert all(low - 1e-6 * span <= tick <= low + span * (1 + 1e-6) for tick in ticks)


def test_two_labels_that_collide_give_way_evenly() -> None:
    assert kept_apart([100, 104], [16]) == (94, 110)


def test_labels_with_room_stay() -> None:
    assert kept_apart([10, 50, 90], [16, 16]) == (10, 50, 90)


@given(places, st.floats(0, 30))
def test_labels_end_up_apart_and_in_order(found: list[float], gap: float) -> None:
    moved = kept_apart(sorted(found), [gap] * (len(found) - 1))
    assert all(b - a >= gap - 1e-9 for a, b in pairwise(moved))


@given(places, st.floats(0, 20))
def test_labels_do_not_drift_as_a_whole(found: list[float], gap: float) -> None:
    """Least squares under an order keeps the mean."""
    ordered = sorted(found)
    assert sum(kept_apart(ordered, [gap] * (len(found) - 1))) == pytest.approx(sum(ordered), abs=1e-6)


@given(places)
def test_labels_stay_inside_when_there_is_room(found: list[float]) -> None:
    moved = apart_within(found, 16, 0, 16 * len(found))
    assert all(-1e-9 <= place <= 16 * len(found) + 1e-9 for place in moved)
    order = sorted(range(len(found)), key=lambda index: found[index])
    assert all(moved[b] - moved[a] >= 16 - 1e-9 for a, b in pairwise(order))


@given(st.floats(0, 300), st.floats(0, 300), st.floats(1, 60), st.floats(1, 300), st.floats(3, 12))
def test_hatching_rises_at_45_degrees_and_keeps_to_its_box(
    left: float, top: float, width: float, height: float, spacing: float
) -> None:
    box = Box(left, top, left + width, top + height)
    for x1, y1, x2, y2 in hatching(box, spacing):
        assert x2 - x1 == pytest.approx(y1 - y2, abs=1e-9)
        assert box.left - 1e-9 <= x1 <= x2 <= box.right + 1e-9
        assert box.top - 1e-9 <= y2 <= y1 <= box.bottom + 1e-9


def test_a_step_line_goes_across_and_then_down() -> None:
    assert step_path([(0, 10), (5, 20), (9, 20)]) == "M0 10H5V20H9"


def test_thinning_keeps_both_ends_and_every_visible_step() -> None:
    points = [(0.0, 0.0), (0.1, 1.0), (0.2, 2.0), (5.0, 3.0), (9.0, 4.0)]
    assert thinned(points, 0.25) == ((0.0, 0.0), (0.1, 2.0), (5.0, 3.0), (9.0, 4.0))
