"""`report TRIAL LOOK --to FOLDER`"""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from pathlib import Path

from app.actions.report import write_report
from app.cli.at_desk import at_desk
from app.cli.parsing import Command, look_number
from app.settings import Settings


def arguments(parser: ArgumentParser) -> None:
    parser.add_argument("trial", metavar="TRIAL", type=Path, help="the trial file")
    parser.add_argument("look", metavar="LOOK", type=look_number, help="the number of a frozen look")
    parser.add_argument(
        "--to", metavar="FOLDER", type=Path, required=True, help="where the files are written"
    )


def run(options: Namespace, settings: Settings) -> int:
    with at_desk(settings, options.trial) as desk:
        for path in write_report(desk, options.look, options.to):
            print(path)
    return 0


COMMAND = Command(arguments, run, example="report Q17.trial 2 --to reports")
