"""The drawings: well-formed, the same each time, in line, nothing on top of anything else."""

from __future__ import annotations

import math
import re
from dataclasses import replace
from itertools import combinations
from xml.etree import ElementTree

import numpy as np
import pytest

from app.render import figures, palette
from app.render.svg import boundary, curves, gauge, residuals, strips
from app.render.svg.element import coordinate
from app.render.svg.lane_plot import NARROW_PAGE, WIDE_PAGE, LanePage, lane_plot
from app.render.svg.lettering import SMALL, broken, point_offset, text_width
from app.sheets.blocks import BoundaryFigure, CurvesFigure, Span
from tests.render import invented_book as invented
from tests.render.drawn_figures import FIGURES, HARM, HOSTILE, SVG, Text, drawings, texts, with_harm

DRAWN = drawings()
every_drawing = pytest.mark.parametrize("svg", DRAWN.values(), ids=DRAWN.keys())

ELEMENTS = {"svg", "title", "desc", "rect", "circle", "polygon", "path", "text", "tspan"}
ATTRIBUTES = {
    *("viewBox", "width", "height", "role", "x", "y", "cx", "cy", "r", "d", "points"),
    *("fill", "fill-opacity", "stroke", "stroke-width", "stroke-dasharray"),
    *("font-family", "font-size", "font-style", "font-weight", "text-anchor"),
}


def test_the_same_figure_gives_the_same_bytes() -> None:
    assert drawings() == DRAWN


@every_drawing
def test_a_drawing_uses_presentation_attributes_and_nothing_that_a_printer_does_not_know(svg: str) -> None:
    for element in ElementTree.fromstring(svg).iter():
        assert element.tag.removeprefix(SVG) in ELEMENTS
        assert set(element.attrib) <= ATTRIBUTES


@every_drawing
def test_a_drawing_has_a_title_and_a_description_first(svg: str) -> None:
    root = ElementTree.fromstring(svg)
    assert root.get("role") == "img"
    first, second = list(root)[:2]
    assert (first.tag, second.tag) == (f"{SVG}title", f"{SVG}desc")
    assert first.text
    assert second.text


@every_drawing
def test_no_text_lies_on_another(svg: str) -> None:
    assert [(a.words, b.words) for a, b in combinations(texts(svg), 2) if a.overlaps(b)] == []


@every_drawing
def test_every_text_keeps_inside_the_drawing(svg: str) -> None:
    root = ElementTree.fromstring(svg)
    width, height = float(root.get("width", "0")), float(root.get("height", "0"))
    outside = [
        t.words
        for t in texts(svg)
        if t.left < -1 or t.right > width + 1 or t.y > height or t.y < 0.6 * t.size
    ]
    assert outside == []


@every_drawing
def test_every_colour_is_one_of_the_palette(svg: str) -> None:
    named = {value for value in vars(palette).values() if isinstance(value, str) and value.startswith("#")}
    arms = {colour for ink in (palette.ARM_A, palette.ARM_B) for colour in (ink.line, ink.text)}
    assert set(re.findall(r"#[0-9A-Fa-f]{3,8}\b", svg)) <= named | arms


@every_drawing
def test_no_number_is_written_with_an_exponent_or_as_none(svg: str) -> None:
    places = ("x", "y", "cx", "cy", "r", "d", "points", "width", "height", "stroke-width")
    values = " ".join(
        element.get(place, "") for element in ElementTree.fromstring(svg).iter() for place in places
    )
    assert not re.search(r"[eE]|nan|inf", values)


def test_coordinates_have_two_decimals_at_most_and_no_negative_zero() -> None:
    assert [coordinate(v) for v in (1.0, 1.5, 1.256, -0.001, 123456.789)] == [
        "1",
        "1.5",
        "1.26",
        "0",
        "123456.79",
    ]


def test_hostile_names_stay_text() -> None:
    svg = DRAWN["curves with hostile names, wide"]
    assert "<script" not in svg
    title = ElementTree.fromstring(svg).find(f"{SVG}title")
    assert title is not None
    assert title.text == HOSTILE.replace("\x00", "\ufffd").replace("\x0b", "\ufffd")


# --- curves -------------------------------------------------------------------------------------------------


def counts_under(svg: str, figure_ticks: tuple[float, ...]) -> list[Text]:
    """Whole numbers in the rows: right-aligned, in the size of labels."""
    return [t for t in texts(svg) if t.anchor == "end" and t.size == 13 and t.words.isdigit()]


def test_digits_at_risk_end_ten_units_right_of_their_tick() -> None:
    figure = invented.curves_figure()
    left, right = curves.WIDE_PAGE.plot.left, curves.WIDE_PAGE.plot.right
    expected = [left + tick / 30 * (right - left) + 10 for tick in figure.ticks]
    found = counts_under(DRAWN["curves, wide"], figure.ticks)
    assert len(found) == 2 * 3 * len(figure.ticks)
    for row in range(6):
        row_of_six = found[6 * row : 6 * row + 6]
        assert [t.x for t in row_of_six] == pytest.approx(expected, abs=0.01)


def test_at_risk_events_and_censored_add_up_to_the_arm_at_every_tick() -> None:
    found = [int(t.words) for t in counts_under(DRAWN["curves, wide"], invented.curves_figure().ticks)]
    for arm in (found[:18], found[18:]):
        assert [sum(arm[tick + row * 6] for row in range(3)) for tick in range(6)] == [450] * 6


def test_arms_are_told_apart_without_colour() -> None:
    """Arm B is drawn twice: a wide stroke and a paper core in it; arm A once."""
    svg = DRAWN["curves, wide"]
    assert svg.count(f'stroke="{palette.ARM_A.line}" stroke-width="1.75"') == 2  # curve and sample
    assert svg.count(f'stroke="{palette.ARM_B.line}" stroke-width="3.25"') == 2
    assert svg.count(f'stroke="{palette.PAPER}" stroke-width="1.25"') == 2


def test_ink_belongs_to_the_letter_masked_or_not() -> None:
    for name in ("curves, wide", "curves masked, wide"):
        words = re.findall(rf'fill="{palette.ARM_A.text}">([^<]*)<', DRAWN[name])
        assert set(words) <= {"Placebo\u00a0(A)", "Arm\u00a0A"}
        assert words


def test_a_curve_of_many_steps_stays_small() -> None:
    """100,000 steps are told apart to a quarter of a unit: about four steps a unit at most."""
    line = invented.curves_figure().lines[0]
    steps = 100_000
    times = tuple(30 * step / steps for step in range(steps))
    survival = tuple(100 - 60 * step / steps for step in range(steps))
    many = type(line)(
        line.arm, times, survival, (None,) * steps, (None,) * steps, ((1.0, 99.0),), line.rows, line.label
    )
    svg = str(curves.wide(type(invented.curves_figure())("t", "d", "x", "y", (0, 30), (many,))))
    assert len(svg) < 120_000


# --- the hazard ratio over time -----------------------------------------------------------------------------

PAGES = {"wide": residuals.WIDE_PAGE, "half": residuals.HALF_PAGE, "narrow": residuals.NARROW_PAGE}


def marks(svg: str, ink: str) -> list[tuple[float, float]]:
    """The left upper corners of the squares of this ink."""
    found = re.search(rf'<path d="([^"]*)" fill="{ink}"/>', svg)
    assert found is not None
    return [(float(x), float(y)) for x, y in re.findall(r"M(\S+) (\S+?)h", found[1])]


@pytest.mark.parametrize("page", PAGES)
def test_marks_of_events_stand_at_their_time_and_height(page: str) -> None:
    figure = invented.residual_figure(events=60)
    x, y = residuals.scales(figure, PAGES[page])
    found = marks(DRAWN[f"residuals of few events, {page}"], palette.INK_3)
    half = residuals.MARK / 2
    for time, height in figure.points:
        assert any(
            abs(left + half - x(time)) <= 0.26 and abs(top + half - y(height)) <= 0.26 for left, top in found
        )
    assert len(found) <= len(figure.points)


@pytest.mark.parametrize("page", PAGES)
def test_the_smooth_and_its_band_go_through_their_places(page: str) -> None:
    """The band along the upper limits, and back along the lower ones."""
    figure, svg = invented.residual_figure(), DRAWN[f"residuals, {page}"]
    x, y = residuals.scales(figure, PAGES[page])
    band = re.search(rf'd="M([^"]*)Z" fill="{palette.BAND}"', svg)
    line = re.search(r'd="M([^"]*)"[^>]*stroke-width="2.5"', svg)
    assert band is not None
    assert line is not None
    upper = [(x(place.time), y(place.high)) for place in figure.smooth]
    lower = [(x(place.time), y(place.low)) for place in reversed(figure.smooth)]
    middle = [(x(place.time), y(place.log_ratio)) for place in figure.smooth]
    for path, wanted in ((band[1], upper + lower), (line[1], middle)):
        found = [[float(part) for part in place.split()] for place in path.split("L")]
        assert np.allclose(found, wanted, atol=0.006)


def test_marks_of_many_events_are_paler_and_few_are_not() -> None:
    assert marks(DRAWN["residuals, half"], palette.MANY_MARKS)
    assert f'fill="{palette.MANY_MARKS}"' not in DRAWN["residuals of few events, half"]


@pytest.mark.parametrize("page", PAGES)
def test_no_mark_and_no_limit_reaches_the_words_for_the_directions(page: str) -> None:
    figure, place = invented.residual_figure(events=60), PAGES[page]
    _, y = residuals.scales(figure, place)
    (_, _, upper), (_, _, lower) = residuals.directions(figure, place)
    ends = [end for point in figure.smooth for end in (point.low, point.high)]
    for height in [*ends, *(height for _, height in figure.points)]:
        assert upper < y(height) - residuals.MARK < y(height) + residuals.MARK < lower - 9


def test_the_one_ratio_is_dashed_and_a_ratio_of_1_is_not() -> None:
    figure, place = invented.residual_figure(), residuals.HALF_PAGE
    _, y = residuals.scales(figure, place)
    across = f"H{place.plot.right:g}"
    dashed = re.findall(r'd="M34 (\S+?)H284"[^>]*stroke-dasharray', DRAWN["residuals, half"])
    assert [float(at) for at in dashed] == [math.floor(y(figure.constant)) + 0.5]
    whole = f'd="M34 {math.floor(y(0.0)) + 0.5:g}{across}" fill="none" stroke="{palette.INK_3}"/>'
    assert whole in DRAWN["residuals, half"]


@pytest.mark.parametrize("page", PAGES)
def test_the_lines_are_named_where_they_end(page: str) -> None:
    figure, place = invented.residual_figure(), PAGES[page]
    _, y = residuals.scales(figure, place)
    found = {t.words: t for t in texts(DRAWN[f"residuals, {page}"])}
    assert abs(found["smooth"].y - y(figure.smooth[-1].log_ratio)) < 24
    assert abs(found["constant"].y - y(figure.constant)) < 24
    assert found["0.804"].y - found["constant"].y == 16
    assert all(found[words].left > place.plot.right for words in ("smooth", "constant", "0.804"))


def test_a_cloud_of_thirty_thousand_events_stays_small() -> None:
    assert len(str(residuals.half(invented.residual_figure(events=30_000)))) < 400_000


def test_two_figures_beside_each_other_have_their_axes_on_one_line() -> None:
    baselines = [
        {t.y for t in texts(DRAWN[f"{name}, half"]) if t.words == "6"} for name in ("log-log", "residuals")
    ]
    assert baselines[0] == baselines[1]
    assert len(baselines[0]) == 1


@pytest.mark.parametrize("page", ["half", "narrow"])
def test_names_beside_the_curves_begin_under_the_top_of_the_plot(page: str) -> None:
    """Above it stands the button to zoom."""
    svg = DRAWN[f"log-log with long names, {page}"]
    named = [t for t in texts(svg) if t.semibold]
    first, second, cut, *others = [t.words for t in named]
    assert (first, second, *others) == ("Extended-", "release", "Matching", "placebo", "capsule")
    assert cut.startswith("tablet w")
    assert cut.endswith("…")
    assert min(t.y for t in named) - 13 * 0.7 > residuals.NARROW_PAGE.plot.top


def test_a_name_breaks_after_a_hyphen_and_keeps_its_spaces_within_a_line() -> None:
    assert broken("Extended-release tablet", 60, most_lines=3) == ("Extended-", "release", "tablet")
    assert broken("Extended-release tablet", 105, most_lines=3) == ("Extended-release", "tablet")
    assert broken("slow release tablet", 80, most_lines=3) == ("slow release", "tablet")


def test_a_figure_that_takes_the_whole_width_is_not_halved() -> None:
    with pytest.raises(TypeError, match="a boundary figure takes the whole width"):
        figures.half(invented.boundary_figure("not crossed"))


# --- boundary -----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(("name", "page"), [("wide", WIDE_PAGE), ("narrow", NARROW_PAGE)])
def test_decimal_points_stand_seven_units_left_of_their_lane(name: str, page: LanePage) -> None:
    plot = lane_plot(invented.boundary_figure("not crossed"), page)
    middles = [plot.middle(lane) for lane in plot.figure.lanes]
    decimals = [
        t
        for t in texts(DRAWN[f"boundary, {name}"])
        if t.y > plot.area.bottom and re.fullmatch(r"−?\d+\.\d+", t.words)
    ]
    assert len(decimals) >= 4 * 4
    for t in decimals:
        point = t.x + point_offset(t.words, semibold=t.semibold)
        assert min(abs(point - (middle - 7)) for middle in middles) < 0.01


def test_z_and_bounds_stand_at_their_height() -> None:
    figure = invented.boundary_figure("not crossed")
    plot = lane_plot(figure, WIDE_PAGE)
    svg = DRAWN["boundary, wide"]
    assert f'cy="{coordinate(plot.y(2.129))}" r="6.5" fill="{palette.INK}"' in svg
    assert f"{coordinate(plot.y(2.434))}H" in svg


def test_a_crossed_look_is_a_diamond_with_its_bar_and_zone_in_the_colour_of_crossed() -> None:
    crossed, not_crossed = DRAWN["boundary crossed, wide"], DRAWN["boundary, wide"]
    assert palette.CROSSED not in not_crossed
    assert f'fill="{palette.CROSSED_ZONE}"' in crossed
    assert re.search(rf'<polygon [^>]*fill="{palette.CROSSED}"', crossed)
    assert re.search(rf'<path [^>]*stroke="{palette.CROSSED}" stroke-width="2.5"', crossed)


def test_masked_the_two_readings_mirror_each_other() -> None:
    """Left lane and right lane swap and turn over when z changes its sign: the drawing favours neither."""
    plot = lane_plot(invented.boundary_figure("masked"), WIDE_PAGE)
    assert plot.y.low == -plot.y.high
    assert plot.y(0) == pytest.approx((plot.area.top + plot.area.bottom) / 2)
    for lane in plot.figure.lanes:
        assert lane.upper is not None
        assert lane.lower is not None
        assert plot.y(lane.upper.value) + plot.y(lane.lower.value) == pytest.approx(2 * plot.y(0))


def test_masked_nothing_is_drawn_as_crossed() -> None:
    assert palette.CROSSED not in DRAWN["boundary masked, wide"]


# --- harm ---------------------------------------------------------------------------------------------------


def zones_of(figure: BoundaryFigure, look: int) -> list[list[tuple[str, str, bool]]]:
    """For each reading of a look: (colour, whether it reaches the top or the bottom, hatched)."""
    plot = lane_plot(figure, WIDE_PAGE)
    (lane,) = [lane for lane in figure.lanes if lane.look == look]
    return [
        [
            (zone.colour, "top" if zone.box.top == plot.area.top else "bottom", zone.hatched)
            for zone in gauge.zones(plot, lane, reading)
        ]
        for reading in gauge.lane_readings(plot, lane)
    ]


def test_harm_is_grey_below_with_a_solid_bar_of_its_own() -> None:
    figure = with_harm("not crossed")
    grey, hatch = palette.ZONE_NOW, palette.HATCH_NOW
    assert zones_of(figure, 3) == [[(grey, "top", False), (grey, "bottom", False), (hatch, "bottom", True)]]
    plot = lane_plot(figure, WIDE_PAGE)
    (reading,) = gauge.lane_readings(plot, figure.lanes[2])
    harm = [bar for bar in gauge.bars(plot, figure.lanes[2], reading) if bar.y == plot.y(HARM[2])]
    assert [(bar.colour, bar.width, bar.dashed) for bar in harm] == [(palette.INK, 2.5, False)]


def test_masked_each_reading_has_its_harm_at_its_own_end() -> None:
    grey, hatch = palette.ZONE_NOW, palette.HATCH_NOW
    left, right = zones_of(with_harm("masked"), 3)
    assert left == [(grey, "top", False), (grey, "bottom", False), (hatch, "bottom", True)]
    assert right == [(grey, "bottom", False), (grey, "top", False), (hatch, "top", True)]
    plot = lane_plot(with_harm("masked"), WIDE_PAGE)
    for lane in plot.figure.lanes:
        one, other = gauge.lane_readings(plot, lane)
        assert {-limit.z for limit in one.limits} == {limit.z for limit in other.limits}


def test_a_crossed_harm_bound_has_its_zone_bar_and_diamond_in_crossed() -> None:
    ((_, harm, _),) = zones_of(FIGURES["boundary with harm crossed"], 3)  # type: ignore[arg-type]
    assert harm == (palette.CROSSED_ZONE, "bottom", False)
    drawn = DRAWN["boundary with harm crossed, wide"]
    assert re.search(rf'<polygon [^>]*fill="{palette.CROSSED}"', drawn)
    assert palette.CROSSED not in DRAWN["boundary with harm, wide"]


def test_masked_harm_is_crossed_in_the_reading_that_crossed_it() -> None:
    left, right = zones_of(FIGURES["boundary masked with harm crossed"], 3)  # type: ignore[arg-type]
    assert [colour for colour, _, _ in left] == [palette.ZONE_NOW, palette.ZONE_NOW, palette.HATCH_NOW]
    assert [colour for colour, _, _ in right] == [palette.ZONE_NOW, palette.CROSSED_ZONE, palette.HATCH_NOW]


def test_rows_beyond_the_page_take_their_room_from_the_lanes() -> None:
    """A laptop screen shows every row: 430 units under one line of an answer, 36 less under two."""
    for name, tallest in (("boundary with harm", 430), ("boundary masked with harm", 394)):
        assert boundary.wide(FIGURES[name]).height <= tallest  # type: ignore[arg-type]
    before = lane_plot(invented.boundary_figure("masked"), WIDE_PAGE).area
    after = lane_plot(with_harm("masked"), WIDE_PAGE).area
    assert 0 < before.bottom - after.bottom <= 16
    assert lane_plot(with_harm("masked"), NARROW_PAGE).area.height == pytest.approx(
        lane_plot(invented.boundary_figure("masked"), NARROW_PAGE).area.height
    )


def test_the_bounds_of_harm_are_joined_by_a_guide_of_their_own() -> None:
    plot = lane_plot(with_harm("not crossed"), WIDE_PAGE)
    harm = [plot.y(z) for z in HARM]
    assert [y for _, y in boundary.guides(plot)[-1]] == harm
    assert len(boundary.guides(lane_plot(with_harm("masked"), WIDE_PAGE))) == 2


def test_only_a_look_ahead_is_called_needed() -> None:
    words = [t.words for t in texts(DRAWN["boundary, wide"])]
    assert "needed\u00a02.005" in words
    assert not any("needed" in t.words for t in texts(DRAWN["boundary masked, wide"]))


def test_rows_that_would_touch_give_way_to_the_table() -> None:
    twenty = [t.words for t in texts(DRAWN["boundary at twenty looks, wide"])]
    assert "Information fraction" not in twenty
    assert [w for w in twenty if w.isdigit()][-20:] == [str(look) for look in range(1, 21)]


def test_a_fraction_over_one_is_on_the_same_scale() -> None:
    plot = lane_plot(FIGURES["boundary run over"], WIDE_PAGE)  # type: ignore[arg-type]
    assert plot.x(1.13) == pytest.approx(639)
    assert plot.x(0.4) == pytest.approx(168 + 0.4 / 1.13 * 471)


def test_a_title_of_the_narrow_drawing_says_which_way_is_up() -> None:
    assert any(
        t.words.endswith("; up favours tablet")
        for t in texts(str(boundary.narrow(invented.boundary_figure("not crossed"))))
    )


def test_long_names_leave_the_end_of_the_title_line_to_what_a_page_sets_there() -> None:
    (title,) = [t for t in texts(DRAWN["boundary with long names, wide"]) if t.words.startswith("z, ")]
    assert title.words.endswith("…")
    assert title.x + text_width(title.words, SMALL) <= WIDE_PAGE.width - boundary.TOOLS
    (narrow,) = [t for t in texts(DRAWN["boundary with long names, narrow"]) if t.words.startswith("z; ")]
    assert narrow.words.startswith("z; up favours extended-release")


def test_a_look_at_the_end_of_the_information_is_a_whole_disc_and_leaves_the_total_to_the_sentence() -> None:
    strip = replace(invented.information_strip(), held=((0.5, Span("269")), (1.002, Span("539"))))
    svg = str(strips.wide(strip))
    discs = [each for each in ElementTree.fromstring(svg).iter() if each.tag == f"{SVG}circle"]
    assert all(float(each.attrib["cx"]) + float(each.attrib["r"]) <= strips.STRIP for each in discs)
    said = [t.words for t in texts(svg)]
    assert strip.total.text not in said
    assert "1" in said


# --- lettering ----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("text", "semibold", "units"),
    [("0.714", False, 2237), ("−20.80", False, 2734), ("At risk", True, 2707), ("Placebo (A)", False, 4722)],
)
def test_text_widths_agree_with_the_font_files(text: str, semibold: bool, units: int) -> None:
    """Sums of the advances in SourceSans3-Regular and -Semibold (1000 units an em), without kerning."""
    assert text_width(text, 1000, semibold=semibold) == pytest.approx(units, rel=0.02)


def test_a_long_name_is_broken_and_at_last_cut() -> None:
    lines = broken("Extended-release tablet with titration (B)", 82, most_lines=2, semibold=True)
    assert len(lines) == 2
    assert lines[-1].endswith("…")
    assert all(text_width(line, semibold=True) <= 82 for line in lines)


def test_a_curve_is_not_drawn_beyond_its_last_observation() -> None:
    """Kaplan & Meier (1958): after the last time, if it was censored, the estimate is not defined."""
    figure = FIGURES["curves"]
    assert isinstance(figure, CurvesFigure)
    first, *others = figure.lines
    half = figure.ticks[-1] / 2
    early = tuple(at for at in range(len(first.time)) if first.time[at] <= half)
    cut = replace(
        first,
        time=tuple(first.time[at] for at in early),
        survival=tuple(first.survival[at] for at in early),
        ci_low=tuple(first.ci_low[at] for at in early),
        ci_high=tuple(first.ci_high[at] for at in early),
        censored_at=(),
        last=half,
    )
    drawn = str(curves.wide(replace(figure, lines=(cut, *others))))
    ink = palette.arm_ink(first.arm).line
    paths = re.findall(rf'<path d="([^"]+)"[^>]*stroke="{ink}"', drawn)
    furthest = max(float(x) for path in paths for x in re.findall(r"H([\d.]+)", path))
    assert furthest == pytest.approx((WIDE_START + WIDE_END) / 2, abs=0.5)


WIDE_START, WIDE_END = 176, 648  # the plot of the wide drawing, on which 0 and the last tick lie
