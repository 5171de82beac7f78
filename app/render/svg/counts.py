"""A row of counts, each with its words under it."""

from __future__ import annotations

from app.render.palette import CROSSED, INK, INK_2
from app.render.svg.drawing import NARROW, STRIP, WIDE, Drawing
from app.render.svg.element import Element
from app.render.svg.lettering import SMALL, broken, words
from app.sheets.blocks import CountsFigure, Span

FEWEST_WIDE = 5  # columns: fewer counts keep the pitch of five, so that sheets agree
NARROWEST = 66.0


def wide(figure: CountsFigure) -> Drawing:
    return _drawn(figure, WIDE, number_size=28, words_size=13, columns=max(FEWEST_WIDE, len(figure.counts)))


def narrow(figure: CountsFigure) -> Drawing:
    return _drawn(figure, NARROW, number_size=20, words_size=SMALL, columns=int(NARROW // NARROWEST))


def strip(figure: CountsFigure, width: float = STRIP) -> Drawing:
    return _drawn(figure, width, number_size=18, words_size=SMALL, columns=int(width // NARROWEST))


def _drawn(
    figure: CountsFigure, width: float, *, number_size: float, words_size: float, columns: int
) -> Drawing:
    pitch = width / columns
    line_height = words_size + 3
    described = [broken(text, pitch - 8, most_lines=3, size=words_size) for _, text in figure.counts]
    row_lines = max((len(lines) for lines in described), default=1)
    row_height = number_size * 1.1 + 4 + row_lines * line_height
    parts: list[Element] = []
    for index, ((number, _), lines) in enumerate(zip(figure.counts, described, strict=True)):
        left, top = pitch * (index % columns), (row_height + 12) * (index // columns)
        parts.append(words(number.text, left, top + number_size, size=number_size, fill=_fill(number)))
        first = top + number_size + line_height + 3
        parts += [
            words(text, left, first + line_height * i, size=words_size, fill=INK_2)
            for i, text in enumerate(lines)
        ]
    n_rows = -(-len(figure.counts) // columns) or 1
    return Drawing(width, n_rows * (row_height + 12) - 12 + 4, figure.title, figure.description, tuple(parts))


def _fill(number: Span) -> str:
    return CROSSED if number.tone == "crossed" else INK
