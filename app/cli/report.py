"""`report TRIAL LOOK --to FOLDER [--open]`"""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from pathlib import Path

from app.actions.open_report import write_open_report
from app.actions.report import write_report
from app.cli.at_desk import at_desk
from app.cli.parsing import Command, look_number
from app.settings import Settings


def arguments(parser: ArgumentParser) -> None:
    parser.add_argument("trial", metavar="TRIAL", type=Path, help="the trial file")
    parser.add_argument(
        "look", metavar="LOOK", type=look_number, help="the number of a look; frozen, but for --open"
    )
    parser.add_argument(
        "--to", metavar="FOLDER", type=Path, required=True, help="where the files are written"
    )

    parser.add_argument(
        "--open",
        action="store_true",
        help="the open report instead: pooled, of a frozen look or of the open one; nothing is recorded",
    )


def run(options: Namespace, settings: Settings) -> int:
    write = write_open_report if options.open else write_report
    with at_desk(settings, options.trial) as desk:
        for path in write(desk, options.look, options.to):
            print(path)
    return 0


COMMAND = Command(arguments, run, example="report Q17.trial 2 --to reports")
