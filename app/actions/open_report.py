"""The open report of a look: its pooled sheets as one file, with nothing of the closed side in it."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from app.actions.desk import Desk
from app.actions.looks import open_book
from app.actions.report import file_stem, write_whole
from app.assets import asset
from app.render.page import page_environment
from app.render.report import render_report


@dataclass(frozen=True)
class OpenReport:
    html: bytes
    stem: str


def open_report(desk: Desk, look: int) -> OpenReport:
    """The pooled sheets as they stand now. Nothing is frozen or recorded: the history is closed material."""
    html = render_report(page_environment(asset("templates")), open_book(desk, look), frozen=None)
    return OpenReport(html, f"{file_stem(desk.trial.state().name)}-look-{look}-open")


def write_open_report(desk: Desk, look: int, folder: Path) -> tuple[Path, ...]:
    """Write the open report into a folder, whole or not at all, and nothing else."""
    report = open_report(desk, look)
    path = folder / f"{report.stem}.html"
    write_whole(path, report.html)
    return (path,)
