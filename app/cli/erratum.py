"""`erratum TRIAL ENTRY --reason TEXT --by NAME`"""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from pathlib import Path

from app.actions.correct import erratum
from app.cli.at_desk import at_desk
from app.cli.parsing import Command, entry_number
from app.settings import Settings


def arguments(parser: ArgumentParser) -> None:
    parser.add_argument("trial", metavar="TRIAL", type=Path, help="the trial file")
    parser.add_argument(
        "entry",
        metavar="ENTRY",
        type=entry_number,
        help="the number of the entry, as the Record sheet has it",
    )
    parser.add_argument(
        "--reason", metavar="TEXT", required=True, help="what is wrong there, and what is right"
    )
    parser.add_argument(
        "--by", metavar="NAME", required=True, help="who corrects it; not an electronic signature"
    )


def run(options: Namespace, settings: Settings) -> int:
    with at_desk(settings, options.trial) as desk:
        erratum(desk, entry=options.entry, correction=options.reason, by=options.by)
    print(f"The correction of entry {options.entry} is recorded; the entry itself stays as it was.")
    return 0


COMMAND = Command(
    arguments, run, example="erratum Q17.trial 7 --reason 'the cutoff was 2026-10-12' --by 'Jane Roe'"
)
