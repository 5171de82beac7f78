"""The colours that exist, and whether they can be read. Contrast: WCAG 2.2, relative luminance (sRGB)."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from app.assets import asset
from app.render import palette

# token: (value, ratio on paper as the look of the pages states it)
ON_PAPER = {
    "ink": (palette.INK, 17.4),
    "ink-2": (palette.INK_2, 7.5),
    "ink-3": (palette.INK_3, 4.9),
    "hairline": (palette.HAIRLINE, 1.7),
    "grid": (palette.GRID, 1.3),
    "arm A line": (palette.ARM_A.line, 5.2),
    "arm A text": (palette.ARM_A.text, 7.4),
    "arm B line": (palette.ARM_B.line, 3.9),
    "arm B text": (palette.ARM_B.text, 6.1),
    "doubt text": ("#7A5200", 6.9),
    "doubt mark": ("#E69F00", 2.3),
    "crossed": (palette.CROSSED, 10.8),
    "crossed zone": (palette.CROSSED_ZONE, 1.4),
    "hatch, past": (palette.HATCH_PAST, 2.1),
}
ZONES = {palette.ZONE_PAST, palette.ZONE_NOW, palette.ZONE_PLANNED}
EXISTING = {value.upper() for value, _ in ON_PAPER.values()} | {palette.PAPER} | ZONES
STYLES = ("static/lookledger.css", "static/positions.css", "static/favicon.svg", "templates/report/look.css")


def luminance(colour: str) -> float:
    channels = (int(colour[at : at + 2], 16) / 255 for at in (1, 3, 5))
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in channels]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(one: str, other: str) -> float:
    darker, lighter = sorted((luminance(one), luminance(other)))
    return (lighter + 0.05) / (darker + 0.05)


def over_paper(colour: str, opacity: float) -> str:
    mixed = (round(opacity * int(colour[at : at + 2], 16) + (1 - opacity) * 255) for at in (1, 3, 5))
    return "#" + "".join(f"{channel:02X}" for channel in mixed)


@pytest.mark.parametrize("style", STYLES)
def test_a_style_uses_no_other_colour(style: str) -> None:
    text = Path(asset(*style.split("/"))).read_text(encoding="utf-8")
    assert {colour.upper() for colour in re.findall(r"#[0-9A-Fa-f]{3,8}\b", text)} <= EXISTING
    assert not re.search(r"\b(rgba?|hsla?|oklch|color-mix)\(", text)


@pytest.mark.parametrize(("colour", "ratio"), ON_PAPER.values(), ids=ON_PAPER.keys())
def test_contrast_on_paper_is_as_stated(colour: str, ratio: float) -> None:
    assert contrast(colour, palette.PAPER) == pytest.approx(ratio, abs=0.06)


@pytest.mark.parametrize(
    "text", [palette.INK, palette.INK_2, palette.ARM_A.text, palette.ARM_B.text, palette.CROSSED]
)
def test_words_can_be_read(text: str) -> None:
    """4.5 to 1 for text (WCAG 1.4.3)."""
    assert contrast(text, palette.PAPER) >= 4.5


def test_lines_keep_three_to_one_where_both_bands_overlap() -> None:
    """WCAG 1.4.11, on the ground that two bands at this opacity make together."""
    one = over_paper(palette.ARM_A.line, palette.BAND_OPACITY)
    blended = [
        round(
            palette.BAND_OPACITY * int(palette.ARM_B.line[at : at + 2], 16)
            + (1 - palette.BAND_OPACITY) * int(one[at : at + 2], 16)
        )
        for at in (1, 3, 5)
    ]
    ground = "#" + "".join(f"{channel:02X}" for channel in blended)
    assert contrast(palette.ARM_A.line, ground) >= 3
    assert contrast(palette.ARM_B.line, ground) >= 3


def test_a_bar_can_be_seen_on_every_zone() -> None:
    assert all(contrast(palette.INK, zone) >= 10 for zone in ZONES)
    assert contrast(palette.CROSSED, palette.CROSSED_ZONE) >= 7


def test_styles_and_drawings_agree_on_what_a_colour_is_for() -> None:
    style = Path(asset("static", "lookledger.css")).read_text(encoding="utf-8")
    named = dict(re.findall(r"--([a-z0-9-]+): (#[0-9A-F]{6});", style))
    assert named == {
        "paper": palette.PAPER,
        "ink": palette.INK,
        "ink-2": palette.INK_2,
        "ink-3": palette.INK_3,
        "hairline": palette.HAIRLINE,
        "arm-a": palette.ARM_A.text,
        "arm-b": palette.ARM_B.text,
        "doubt": "#7A5200",
        "doubt-mark": "#E69F00",
        "crossed": palette.CROSSED,
    }
