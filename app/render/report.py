"""A frozen look as one HTML file: no script, no request, figures as SVG, faces and record inside."""

from __future__ import annotations

import base64
import hashlib
import re
from dataclasses import dataclass
from functools import cache
from itertools import count
from pathlib import Path

from jinja2 import Environment
from markupsafe import Markup

from app.render.page import DISCLOSED
from app.render.palette import INK, PAPER
from app.render.spine import spine_marks
from app.sheets.blocks import LookBook, MethodLine, PageFrame, Sheet, Table
from app.sheets.caution import CAUTION, LEAD


@dataclass(frozen=True)
class ReportFacts:
    """What a report is bound to: `frozen_at` as it is read ("26 Jan 2027, 14:05 UTC"), digests in hex."""

    frozen_at: str
    by: str
    head_before: str
    plan_digest: str
    snapshot_digests: tuple[str, ...]
    record_json: str
    record_digest: str
    program: str


def render_report(environment: Environment, book: LookBook, *, frozen: ReportFacts | None) -> bytes:
    """Same book and facts in, same bytes out: nothing is taken from a clock, a network or a machine.

    Without facts it is an open report: no freeze, head, digest or record stands in it.
    """
    style = _style(environment, book.frame, frozen)
    page = environment.get_template("report/look.html").render(
        book=book,
        frozen=frozen,
        stated=stated(book.frame, frozen),
        style=Markup(style),  # made of our own template and of strings escaped for CSS
        style_digest=base64.b64encode(hashlib.sha256(style.encode()).digest()).decode(),
        links={sheet.key: f"#sheet-{sheet.key}" for sheet in book.sheets},
        numbered_tables=numbered_tables,
        methods=methods_once(book),
    )
    return page.encode()


def methods_once(book: LookBook) -> tuple[MethodLine, ...]:
    """How everything in the report was computed, each entry where it is first needed and once."""
    entries = (entry for sheet in book.sheets if sheet.number is not None for entry in sheet.methods)
    return tuple(dict.fromkeys(entries))


# --- tables -------------------------------------------------------------------------------------------------


Numbered = tuple[tuple[str, Table], ...]


@dataclass(frozen=True)
class NumberedTables:
    """Tables with their numbers, in the order of the page.

    In two columns under the figure, those of two figures likewise, as wide as the page, and at the end.
    """

    narrow: Numbered
    beside: Numbered
    wide: Numbered
    further: Numbered


def numbered_tables(sheet: Sheet) -> NumberedTables:
    """4.1, 4.2 ... in the order in which they stand; tables of two figures stand beside each other."""
    beside, under = (sheet.figure_tables, ()) if sheet.second_figure else ((), sheet.figure_tables)
    parts = (sheet.tables, beside, (*under, *sheet.wide_tables), sheet.folded)
    counter = count(1)
    return NumberedTables(
        *(tuple((_table_number(sheet, next(counter)), table) for table in part) for part in parts)
    )


def _table_number(sheet: Sheet, place: int) -> str:
    return f"{sheet.number}.{place}" if sheet.number is not None else ""


# --- style --------------------------------------------------------------------------------------------------

FACES = (
    ("Source Serif 4", 400, "normal", "source-serif/SourceSerif4-Regular.ttf.woff2"),
    ("Source Serif 4", 400, "italic", "source-serif/SourceSerif4-It.ttf.woff2"),
    ("Source Serif 4 Subhead", 400, "normal", "source-serif/SourceSerif4Subhead-Regular.ttf.woff2"),
    ("Source Sans 3", 400, "normal", "source-sans/SourceSans3-Regular.ttf.woff2"),
    ("Source Sans 3", 600, "normal", "source-sans/SourceSans3-Semibold.ttf.woff2"),
)


@dataclass(frozen=True)
class Face:
    """A face as the style carries it: the file whole, so that the report opens from disk as it was meant."""

    family: str
    weight: int
    style: str
    base64: str


@dataclass(frozen=True)
class LabelCell:
    """Half of the label in the head of each page. Solid is disclosed."""

    text: Markup
    ink: Markup


def _style(environment: Environment, frame: PageFrame, frozen: ReportFacts | None) -> str:
    return environment.get_template("report/look.css").render(
        faces=_faces(environment.globals["fonts"]),
        label_cells=(_label_cell(frame.side), _label_cell(frame.disclosure)),
        head_lines=css_text("\n".join(_head_lines(frame, frozen))),
        foot_lines=css_text("\n".join(_foot_lines(frame, frozen))),
        places=sorted(spine_marks(frame.spine).places),
    )


@cache
def _faces(fonts: Path) -> tuple[Face, ...]:
    return tuple(
        Face(family, weight, style, base64.b64encode((fonts / file).read_bytes()).decode())
        for family, weight, style, file in FACES
    )


def _label_cell(word: str) -> LabelCell:
    ground, ink = (INK, PAPER) if DISCLOSED[word] else (PAPER, INK)
    return LabelCell(css_text(word.upper()), Markup(f"background: {ground}; color: {ink};"))


def _head_lines(frame: PageFrame, frozen: ReportFacts | None) -> tuple[str, str]:
    return f"{frame.trial_name}\u2003{frame.trial_title}", stated(frame, frozen)


def stated(frame: PageFrame, frozen: ReportFacts | None) -> str:
    """ "Look 3, planned, frozen 26 Jan 2027, 14:05 UTC. Plan version 2": of a frozen report also when."""
    look, *others = frame.colophon
    if frozen is not None:
        look = f"{look.rpartition(', ')[0]}, frozen {frozen.frozen_at}"
    return ". ".join((look, *others))


def _foot_lines(frame: PageFrame, frozen: ReportFacts | None) -> tuple[str, ...]:
    dates = (f"{mark.name} {mark.text}{_days(mark.days_since_previous)}" for mark in frame.dates)
    head = (f"Chain head before this freeze {shortened_digest(frozen.head_before)}",) if frozen else ()
    return f"{LEAD} {CAUTION}", "\u2003".join(dates), *head


def _days(days: int | None) -> str:
    return "" if days is None else f" ({days} {'day' if days == 1 else 'days'})"


def shortened_digest(digest: str) -> str:
    """ "8c41 77d0 … 19e2": enough to tell two heads apart; the whole one stands in the record."""
    return digest if len(digest) <= 16 else f"{digest[:4]} {digest[4:8]} … {digest[-4:]}"


PLAIN_IN_CSS = re.compile(r"[A-Za-z0-9 .,;:()+-]")


def css_text(text: str) -> Markup:
    """`text` for the inside of a CSS string, where nothing of it can end the string or the style element."""
    return Markup("".join(c if PLAIN_IN_CSS.fullmatch(c) else f"\\{ord(c):x} " for c in text))
