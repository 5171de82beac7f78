"""`demo`: the invented trial, at its third look, the fourth extract ready to be received."""

from __future__ import annotations

import tempfile
import tomllib
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
    print(f"An invented trial; nobody was treated.\n{ready_text()}")
    with Desk.open(settings, path) as desk:
        return serve_until_stopped(desk, port=options.port, browser=not options.no_browser)


def ready_text() -> str:
    """The extract that waits to be uploaded, with what the form asks about it."""
    scenario = tomllib.loads(asset("demo_data", "extracts.toml").read_text(encoding="utf-8"))
    waiting = (extract for extract in scenario["extract"] if "received_at" not in extract)
    return "".join(
        f"Ready to upload: {asset('demo_data', extract['file'])}\n"
        f"  data cutoff {extract['cutoff']}, extract taken {extract['extracted']}, a {extract['kind']} look\n"
        for extract in waiting
    )


COMMAND = Command(arguments, run, example="demo --to demo.trial")
