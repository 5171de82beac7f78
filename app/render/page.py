"""Pages of a look as HTML. Templates say the order; everything they are given is ready to be set."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import Any

from jinja2 import Environment, FileSystemLoader, StrictUndefined
from markupsafe import Markup

from app.errors import AppError
from app.render import figures
from app.render.spine import spine_marks
from app.render.svg import strips
from app.render.table_setting import column_padding, is_short
from app.sheets.blocks import ChancesFigure, CountsFigure, Figure, LookBook, PageFrame, Row, Strip, Table
from app.sheets.caution import CAUTION, LEAD

STATIC = "/static"
DISCLOSED = {"closed": True, "open": False, "unmasked": True, "masked": False, "pooled": False}


class SheetMissing(AppError):
    """The look has no sheet of that name."""


def page_environment(templates: Path) -> Environment:
    """The templates under `templates`, with what every page may call."""
    environment = Environment(
        loader=FileSystemLoader(templates),
        autoescape=True,  # for every ending: select_autoescape would leave .svg and .css alone
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    environment.globals.update(
        static=STATIC,
        fonts=templates.parent / "static" / "fonts",  # a report carries them inside
        caution=CAUTION,
        caution_lead=LEAD,
        disclosed=DISCLOSED,
        drawn_wide=drawn_wide,
        drawn_half=drawn_half,
        drawn_narrow=drawn_narrow,
        strip_wide=strip_wide,
        strip_narrow=strip_narrow,
        spine_marks=spine_marks,
        column_padding=column_padding,
        has_chart=has_chart,
        with_row=with_row,
        is_short=is_short,
        sheet_links=sheet_links,
        look_links=look_links,
        neighbours=neighbours,
    )
    return environment


def drawn_wide(figure: Figure) -> Markup:
    return Markup(figures.wide(figure))  # markup of our own making, escaped where it was built


def drawn_half(figure: Figure) -> Markup:
    return Markup(figures.half(figure))


def drawn_narrow(figure: Figure) -> Markup:
    return Markup(figures.narrow(figure))


def strip_wide(strip: Strip) -> Markup:
    return Markup(strips.wide(strip))


def strip_narrow(strip: Strip) -> Markup:
    return Markup(strips.narrow(strip))


def has_chart(figure: Figure | None) -> bool:
    """Whether there is anything to zoom into."""
    return figure is not None and not isinstance(figure, CountsFigure | ChancesFigure)


def with_row(table: Table, row: Row | None) -> Table:
    """The table with one more row, for a page that was asked for it."""
    return table if row is None else replace(table, rows=(*table.rows, row))


def look_address(base: str, look: int, key: str) -> str:
    return f"{base}/looks/{look}/{key}"


def sheet_links(frame: PageFrame, base: str) -> dict[str, str]:
    """Where each sheet of this look is, by key."""
    return {key: look_address(base, frame.look, key) for key, _, _ in frame.sheets}


def look_links(frame: PageFrame, base: str, sheet_key: str | None) -> dict[int, str]:
    """The same sheet of every look that has sheets, by the look's number."""
    key = sheet_key or frame.sheets[0][0]
    here = (look for look in frame.spine.looks if look.state in ("frozen", "open"))
    return {look.number: look_address(base, look.number, key) for look in here}


Neighbour = tuple[str, int | None, str] | None


def neighbours(frame: PageFrame, sheet_key: str) -> tuple[Neighbour, Neighbour]:
    """The sheets before and after this one."""
    keys = [key for key, _, _ in frame.sheets]
    at = keys.index(sheet_key)
    before = frame.sheets[at - 1] if at > 0 else None
    return before, frame.sheets[at + 1] if at + 1 < len(keys) else None


def render_page(
    environment: Environment,
    template: str,
    *,
    frame: PageFrame | None,
    base: str,
    sheet_key: str | None = None,
    **context: Any,
) -> str:
    """Any page that extends base.html; `frame` is None before a look, `base` is "/closed" or "/open"."""
    page = environment.get_template(template)
    return page.render(frame=frame, base=base, sheet_key=sheet_key, **context)


def render_sheet(
    environment: Environment,
    book: LookBook,
    sheet_key: str,
    *,
    base: str,
    template: str = "sheet.html",
    **context: Any,
) -> str:
    """One sheet of a look; `template` may extend sheet.html and fill its blocks from `context`."""
    sheet = book.sheet(sheet_key)
    if sheet is None:
        raise SheetMissing(
            "no such sheet",
            where=f"look {book.frame.look}",
            found=repr(sheet_key),
            accepted=", ".join(key for key, _, _ in book.frame.sheets),
        )
    return render_page(
        environment, template, frame=book.frame, base=base, sheet_key=sheet_key, sheet=sheet, **context
    )
