"""The sheets of a look, on either side, with their figures and the record."""

from __future__ import annotations

from typing import Any

from fastapi import APIRouter
from starlette.exceptions import HTTPException
from starlette.responses import HTMLResponse, JSONResponse, Response

from app.actions.looks import closed_book, looks, open_book, record_of
from app.actions.open_report import open_report
from app.actions.what_if import ask_what_if
from app.record.text import record_bytes
from app.render.csv_tables import sheet_tables
from app.render.page import render_sheet
from app.render.plotly_figures import plotly_figure
from app.sheets.blocks import LookBook, PageFrame, Sheet
from app.web.files import archive, attachment, tables_stem
from app.web.sessions import Session
from app.web.site import LookNumber, Site, TheSession, TheSite

router = APIRouter()

JSON = "application/json"
CLOSED, OPEN = "/closed", "/open"


@router.get("/closed/looks/{look}/record.json")
def closed_record(site: TheSite, session: TheSession, look: LookNumber) -> Response:
    """The record as the closed view now shows it; to read it is to open the look's results."""
    closed_look(site, session, look)
    return Response(record_bytes(record_of(site.desk, look)), media_type=JSON)


@router.get("/closed/looks/{look}/{sheet}/figure.json")
def closed_figure(site: TheSite, session: TheSession, look: LookNumber, sheet: str) -> Response:
    return figure(closed_look(site, session, look), sheet, 0)


@router.get("/closed/looks/{look}/{sheet}/second-figure.json")
def closed_second_figure(site: TheSite, session: TheSession, look: LookNumber, sheet: str) -> Response:
    return figure(closed_look(site, session, look), sheet, 1)


@router.get("/closed/looks/{look}/{sheet}/tables.zip")
def closed_tables(site: TheSite, session: TheSession, look: LookNumber, sheet: str) -> Response:
    return tables(closed_look(site, session, look), sheet)


@router.get("/closed/looks/{look}/outlook")
def closed_outlook(site: TheSite, session: TheSession, look: LookNumber, hazard_ratio: str = "") -> Response:
    """The Outlook sheet, and what would be under a hazard ratio that the reader chose."""
    book = closed_look(site, session, look)
    asked = ask_what_if(site.desk, look, hazard_ratio.strip())
    return page(site, book, "outlook", CLOSED, status=422 if asked.refusal else 200, what_if=asked)


@router.get("/closed/looks/{look}/{sheet}")
def closed_sheet(site: TheSite, session: TheSession, look: LookNumber, sheet: str) -> Response:
    return page(site, closed_look(site, session, look), sheet, CLOSED)


@router.get("/open/looks/{look}/{sheet}/figure.json")
def open_figure(site: TheSite, look: LookNumber, sheet: str) -> Response:
    return figure(open_look(site, look), sheet, 0)


@router.get("/open/looks/{look}/{sheet}/tables.zip")
def open_tables(site: TheSite, look: LookNumber, sheet: str) -> Response:
    return tables(open_look(site, look), sheet)


@router.get("/open/looks/{look}/report")
def download_open_report(site: TheSite, look: LookNumber) -> Response:
    require_look(site, look)
    report = open_report(site.desk, look)
    return attachment(report.html, f"{report.stem}.html", "text/html; charset=utf-8")


@router.get("/open/looks/{look}/{sheet}")
def open_sheet(site: TheSite, look: LookNumber, sheet: str) -> Response:
    return page(site, open_look(site, look), sheet, OPEN)


def closed_look(site: Site, session: Session, look: int) -> LookBook:
    """The book of a look; that this session opened its results is recorded once."""
    require_look(site, look)
    return closed_book(site.desk, look, session=session.id, by=session.by)


def newest_frame(site: Site, session: Session) -> PageFrame | None:
    """What stands around a page of the closed side that is no sheet; nothing before there is a look."""
    numbers = looks(site.desk)
    return closed_look(site, session, numbers[-1]).frame if numbers else None


def open_look(site: Site, look: int) -> LookBook:
    require_look(site, look)
    return open_book(site.desk, look)


def require_look(site: Site, look: int) -> None:
    if look not in looks(site.desk):
        raise HTTPException(404)


def page(site: Site, book: LookBook, sheet: str, base: str, *, status: int = 200, **more: Any) -> Response:
    require_sheet(book, sheet)
    told = {"damage": site.damage, "clock_doubts": site.take_clock_doubts()} if base == CLOSED else {}
    html = render_sheet(site.environment, book, sheet, base=base, template="forms/sheet.html", **told, **more)
    return HTMLResponse(html, status_code=status)


def figure(book: LookBook, sheet: str, place: int) -> Response:
    """The interactive figure of a sheet, the first or the second; without one there is no such address."""
    drawn = require_sheet(book, sheet).figures
    interactive = plotly_figure(drawn[place], beside=len(drawn) > 1) if place < len(drawn) else None
    if interactive is None:
        raise HTTPException(404)
    return JSONResponse(interactive)


def tables(book: LookBook, key: str) -> Response:
    """The tables of a sheet as CSV files in one archive, named after the look and its data cutoff."""
    files = sheet_tables(require_sheet(book, key))
    if not files:
        raise HTTPException(404)
    return attachment(archive(files), f"{tables_stem(book.frame)}-{key}.zip", "application/zip")


def require_sheet(book: LookBook, key: str) -> Sheet:
    sheet = book.sheet(key)
    if sheet is None:
        raise HTTPException(404)
    return sheet
