"""Serving a trial file: what `serve` and `demo` share."""

from __future__ import annotations

import os
import sys
import tempfile
import webbrowser
from argparse import ArgumentParser
from html import escape
from importlib import import_module
from pathlib import Path

from app.actions.desk import Desk
from app.cli.parsing import port

SERVER = "app.web.server"


def serving_arguments(parser: ArgumentParser) -> None:
    parser.add_argument(
        "--port", type=port, default=0, metavar="N", help="a port of 127.0.0.1; default: a free one"
    )
    parser.add_argument("--no-browser", action="store_true", help="print the links and open no browser")


def serve_until_stopped(desk: Desk, *, port: int, browser: bool) -> int:
    """Print both links, open the closed one where there is a display, and serve until Ctrl-C.

    The pages lie beside the command line, not under it, so neither imports the other: the server is started
    by name here, as commands are, and gets everything it needs passed.
    """
    with tempfile.TemporaryDirectory(prefix="lookledger-") as folder:

        def announce(closed_link: str, open_link: str) -> None:
            print(links_text(desk.path, closed_link, open_link), flush=True)
            if browser and has_display():
                open_in_browser(closed_link, Path(folder))

        import_module(SERVER).serve(desk.settings, desk, port=port, announce=announce)
    print("\nStopped. Sessions and keys of this start are void.")
    return 0


def links_text(path: Path, closed_link: str, open_link: str) -> str:
    return (
        f"Serving {path} to browsers on this machine, until Ctrl-C.\n\n"
        f"  closed  {closed_link}\n"
        f"  open    {open_link}\n\n"
        "Whoever has the closed link sees everything; the open link shows pooled results only. "
        "Both are void once the server stops."
    )


def has_display() -> bool:
    """Whether a browser could show itself; without a display some systems start a text browser right here."""
    shows_itself = sys.platform in ("win32", "darwin")
    return shows_itself or bool(os.environ.get("DISPLAY") or os.environ.get("WAYLAND_DISPLAY"))


def open_in_browser(link: str, folder: Path) -> None:
    """Open `link` by way of a private file: the command line of a browser can be read by every user."""
    page = folder / "enter.html"
    page.touch(mode=0o600)
    target = escape(link)
    page.write_text(
        f'<!doctype html><meta charset="utf-8"><title>Lookledger</title>'
        f'<meta http-equiv="refresh" content="0; url={target}"><a href="{target}">Enter</a>',
        encoding="utf-8",
    )
    webbrowser.open(page.as_uri())
