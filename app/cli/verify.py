"""`verify TRIAL | REPORT`"""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from pathlib import Path

from app.actions.check import verify
from app.cli.parsing import Command
from app.errors import AccuracyNotReached
from app.settings import Settings


def arguments(parser: ArgumentParser) -> None:
    parser.add_argument(
        "what",
        metavar="TRIAL|REPORT",
        type=Path,
        help="a trial file, a report's .html, or a folder of a report",
    )


def run(options: Namespace, settings: Settings) -> int:
    report = verify(settings, options.what)
    for line in report.lines:
        print(f"{'ok    ' if line.ok else 'FAILED'}  {line.text}")
    return 0 if report.ok else AccuracyNotReached.exit_code


COMMAND = Command(arguments, run, example="verify Q17.trial")
