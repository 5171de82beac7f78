"""`freeze TRIAL --by NAME`"""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from pathlib import Path

from app.actions.freeze import freeze
from app.cli.at_desk import at_desk
from app.cli.parsing import Command
from app.settings import Settings


def arguments(parser: ArgumentParser) -> None:
    parser.add_argument("trial", metavar="TRIAL", type=Path, help="the trial file")
    parser.add_argument(
        "--by", metavar="NAME", required=True, help="who freezes it; not an electronic signature"
    )


def run(options: Namespace, settings: Settings) -> int:
    with at_desk(settings, options.trial) as desk:
        frozen = freeze(desk, by=options.by)
    print(f"Look {frozen.look} is frozen; it cannot change any more.")
    print(f"Report  sha256 {frozen.report_digest}")
    print(f"Head    {frozen.head}")
    return 0


COMMAND = Command(arguments, run, example="freeze Q17.trial --by 'Jane Roe'")
