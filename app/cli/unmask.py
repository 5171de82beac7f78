"""`unmask TRIAL --reason TEXT --by NAME`"""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from pathlib import Path

from app.actions.unmask import unmask
from app.cli.at_desk import at_desk
from app.cli.parsing import Command
from app.settings import Settings


def arguments(parser: ArgumentParser) -> None:
    parser.add_argument("trial", metavar="TRIAL", type=Path, help="the trial file")
    parser.add_argument(
        "--reason", metavar="TEXT", required=True, help="why; it is recorded and cannot be undone"
    )
    parser.add_argument(
        "--by", metavar="NAME", required=True, help="who unmasks; not an electronic signature"
    )


def run(options: Namespace, settings: Settings) -> int:
    with at_desk(settings, options.trial) as desk:
        unmask(desk, reason=options.reason, by=options.by)
    print("The arms are unmasked from now on; reports frozen before stay as they are.")
    return 0


COMMAND = Command(
    arguments, run, example="unmask Q17.trial --reason 'asked for by the committee' --by 'Jane Roe'"
)
