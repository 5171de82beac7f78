"""`demo`: the invented trial, at its third look, the fourth extract ready to be received."""

from __future__ import annotations

import tempfile
from argparse import ArgumentParser, Namespace
from pathlib import Path

from app.actions.demo import make_demo
from app.actions.desk import Desk
from app.assets import asset
from app.cli.parsing import Command
from app.cli.serving import serve_until_stopped, serving_arguments
from app.settings import Settings

NAME = "demo.trial"


def arguments(parser: ArgumentParser) -> None:
    parser.add_argument(
        "--to",
        metavar="PATH",
        type=Path,
        help="the trial file to make; default: a new one in a temporary folder",
    )
    serving_arguments(parser)


def run(options: Namespace, settings: Settings) -> int:
    path = options.to or Path(tempfile.mkdtemp(prefix="lookledger-demo-")) / NAME
    make_demo(settings, path)
    print(f"An invented trial; nobody was treated. Extracts to try are in {asset('demo_data')}.")
    with Desk.open(settings, path) as desk:
        return serve_until_stopped(desk, port=options.port, browser=not options.no_browser)


COMMAND = Command(arguments, run, example="demo --to demo.trial")
