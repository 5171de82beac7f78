"""`start PLAN TRIAL`"""

from __future__ import annotations

import getpass
from argparse import ArgumentParser, Namespace
from pathlib import Path

from app.actions.start import start
from app.cli.files import read_file
from app.cli.parsing import Command
from app.cli.said import tell
from app.settings import Settings


def arguments(parser: ArgumentParser) -> None:
    parser.add_argument("plan", metavar="PLAN", type=Path, help="the plan, a TOML file; locked as it is")
    parser.add_argument("trial", metavar="TRIAL", type=Path, help="the trial file to make; it must not exist")
    parser.add_argument(
        "--by",
        metavar="NAME",
        default=getpass.getuser(),
        help="who locks the plan; default: the name of this account; not an electronic signature",
    )


def run(options: Namespace, settings: Settings) -> int:
    plan = read_file(options.plan)
    doubts = start(settings, plan_name=options.plan.name, plan=plan, path=options.trial, by=options.by)
    tell(doubts)
    print(f"Locked {options.plan.name} into {options.trial}. No key of it can change unrecorded.")
    return 0


COMMAND = Command(arguments, run, example="start plan.toml Q17.trial --by 'Jane Roe'")
