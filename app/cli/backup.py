"""`backup TRIAL TO [--by NAME]`"""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from pathlib import Path

from app.actions.backup import backup
from app.cli.at_desk import at_desk
from app.cli.parsing import Command
from app.settings import Settings


def arguments(parser: ArgumentParser) -> None:
    parser.add_argument("trial", metavar="TRIAL", type=Path, help="the trial file")
    parser.add_argument(
        "to", metavar="TO", type=Path, help="a new file, or a folder for a file named by the time"
    )
    parser.add_argument("--by", metavar="NAME", default="", help="who makes it; not an electronic signature")


def run(options: Namespace, settings: Settings) -> int:
    with at_desk(settings, options.trial) as desk:
        made = backup(desk, options.to, by=options.by)
    print(f"Backed up and verified: {made.path}")
    print(f"File    sha256 {made.digest}")
    print(f"Head    {made.head}")
    if not made.recorded:
        print("The trial file may only be read, so that the backup is not recorded in it.")
    return 0


COMMAND = Command(arguments, run, example="backup Q17.trial Q17-backup.trial --by 'Jane Roe'")
