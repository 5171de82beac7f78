"""`serve TRIAL`"""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from pathlib import Path

from app.cli.at_desk import at_desk
from app.cli.parsing import Command
from app.cli.serving import serve_until_stopped, serving_arguments
from app.settings import Settings


def arguments(parser: ArgumentParser) -> None:
    parser.add_argument("trial", metavar="TRIAL", type=Path, help="the trial file")
    serving_arguments(parser)


def run(options: Namespace, settings: Settings) -> int:
    with at_desk(settings, options.trial) as desk:
        return serve_until_stopped(desk, port=options.port, browser=not options.no_browser)


COMMAND = Command(arguments, run, example="serve Q17.trial")
