"""Text in a drawing: how wide it is, how a line of spans is set, how names are broken.

Widths are the advances of the two shipped sans weights in thousandths of the size, read once from the font
files; a drawing has no browser to ask, and a label must know whether it has room.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import replace
from typing import Literal

from app.render.palette import CROSSED, INK, INK_2
from app.render.svg.element import Element, element
from app.sheets.blocks import Line, Span

SANS = "'Source Sans 3'"
SERIF = "'Source Serif 4'"  # quoted: a family name in CSS may not have a word that begins with a digit
LABEL = 13.0
SMALL = 12.0

Anchor = Literal["start", "middle", "end"]

REGULAR_WIDTHS: dict[int, str] = {
    200: " \u00a0",
    246: "ijl|.,:;·'’‘",
    300: "fI!()[]{}-‑",
    343: "tr/",
    425: 'sz*"',
    460: "cxvy",
    484: "JLYke–",
    497: "0123456789+−±=<>≤≥×$#\u2007",
    504: "agFX",
    525: "VSTEZ",
    546: "Ahun",
    555: "bdpq√α",
    570: "oPRCK",
    612: "BGD&←→↑↓",
    650: "UNHOQ",
    725: "wMΦ",
    800: "W—",
    835: "m%@…",
}
SEMIBOLD_WIDTHS: dict[int, str] = {
    200: " \u00a0",
    270: "ijl|.,:;·'’‘",
    320: "fI!()[]{}-‑",
    368: "tr/",
    440: 'sz*"',
    482: "cxvy–",
    505: "JLYkeF",
    513: "0123456789+−±=<>≤≥×$#\u2007",
    520: "ag",
    545: "VSTEZX",
    560: "Ahun",
    564: "bdpq√α",
    590: "oPRCK",
    625: "BGD&←→↑↓",
    665: "UNHOQ",
    747: "wMΦ",
    800: "W—",
    850: "m%@…",
}
UNKNOWN_WIDTH = 600
PIECE = re.compile(r"[^\s-]*-+\s*|[^\s-]+\s*")  # a word, or its part up to a hyphen, with the spaces after it


def _by_character(widths: dict[int, str]) -> dict[str, int]:
    return {character: width for width, characters in widths.items() for character in characters}


REGULAR = _by_character(REGULAR_WIDTHS)
SEMIBOLD = _by_character(SEMIBOLD_WIDTHS)


def text_width(text: str, size: float = LABEL, *, semibold: bool = False) -> float:
    """The advance of `text`, right to a few percent (digits, minus and point to a tenth of one)."""
    widths = SEMIBOLD if semibold else REGULAR
    return sum(widths.get(character, UNKNOWN_WIDTH) for character in text) * size / 1000


def plain(line: Line) -> str:
    return "".join(span.text for span in line)


def line_width(line: Line, size: float = LABEL, *, semibold: bool = False) -> float:
    return sum(text_width(s.text, size, semibold=semibold or s.tone == "strong") for s in line)


def words(
    text: str | Line,
    x: float,
    y: float,
    *,
    size: float = LABEL,
    fill: str = INK,
    anchor: Anchor = "start",
    semibold: bool = False,
) -> Element:
    """A line of text on the baseline `y`; symbols in serif italic, coloured tones in their colour."""
    children = (text,) if isinstance(text, str) else tuple(_run(span) for span in text)
    return element(
        "text",
        *children,
        x=x,
        y=y,
        font_size=size,
        font_weight=600 if semibold else None,
        fill=fill,
        text_anchor=None if anchor == "start" else anchor,
    )


def _run(span: Span) -> Element | str:
    if span.tone == "symbol":
        return element("tspan", span.text, font_family=SERIF, font_style="italic", font_weight=400)
    if span.tone == "strong":
        return element("tspan", span.text, font_weight=600)
    if span.tone == "crossed":
        return element("tspan", span.text, fill=CROSSED)
    if span.tone == "quiet":
        return element("tspan", span.text, fill=INK_2)
    return span.text


def point_offset(text: str, size: float = LABEL, *, semibold: bool = False) -> float:
    """Width of what stands before the decimal point: start text at x - this and its point falls on x."""
    return text_width(text.partition(".")[0], size, semibold=semibold)


def broken(
    text: str, width: float, *, most_lines: int, size: float = LABEL, semibold: bool = False
) -> tuple[str, ...]:
    """`text` in lines no wider than `width`, broken at spaces and hyphens; what is too much ends in "…"."""
    if text_width(text, size, semibold=semibold) <= width:
        return (text,)
    lines: list[str] = []
    for piece in PIECE.findall(text):
        if lines and text_width((lines[-1] + piece).rstrip(), size, semibold=semibold) <= width:
            lines[-1] += piece
        else:
            lines.append(piece)
    if len(lines) > most_lines:
        lines = [*lines[: most_lines - 1], "".join(lines[most_lines - 1 :])]
    return tuple(shortened(line.rstrip(), width, size=size, semibold=semibold) for line in lines)


def shortened(text: str, width: float, *, size: float = LABEL, semibold: bool = False) -> str:
    if text_width(text, size, semibold=semibold) <= width:
        return text
    while text and text_width(f"{text}…", size, semibold=semibold) > width:
        text = text[:-1]
    return f"{text.rstrip()}…"


def shortened_line(line: Line, width: float, *, size: float = LABEL) -> Line:
    """`line` with its last span shortened to what `width` leaves for it."""
    *first, last = line
    room = width - line_width(tuple(first), size)
    return (*first, replace(last, text=shortened(last.text, room, size=size)))


def fraction_text(fraction: float) -> str:
    """A planned fraction: 0, 1, two decimals, or three where the plan has them."""
    if fraction in (0.0, 1.0):
        return f"{fraction:g}"
    return f"{fraction:.2f}" if abs(fraction - round(fraction, 2)) < 5e-4 else f"{fraction:.3f}"


def widest(texts: Sequence[str], size: float = LABEL, *, semibold: bool = False) -> float:
    return max((text_width(text, size, semibold=semibold) for text in texts), default=0.0)
