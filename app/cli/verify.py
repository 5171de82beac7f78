"""`verify TRIAL | REPORT [--head DIGEST]... [--record --by NAME]`"""

from __future__ import annotations

import sys
from argparse import ArgumentParser, Namespace
from pathlib import Path

from app.actions.check import Progress, quietly, read_head, record_verification, verify
from app.cli.at_desk import at_desk
from app.cli.parsing import Command
from app.errors import AccuracyNotReached, InputError
from app.settings import Settings
from app.verification.check import CheckReport


def arguments(parser: ArgumentParser) -> None:
    parser.add_argument(
        "what",
        metavar="TRIAL|REPORT",
        type=Path,
        help="a trial file, a report's .html, or a folder of reports",
    )
    parser.add_argument(
        "--head",
        dest="heads",
        metavar="DIGEST",
        type=read_head,
        action="append",
        default=[],
        help="a head kept elsewhere, as in the minutes; the history must hold it. Repeat it for each",
    )
    parser.add_argument(
        "--record",
        action="store_true",
        help="enter the verification into the trial file when nothing is found",
    )
    parser.add_argument(
        "--by", metavar="NAME", help="who verifies, for --record; not an electronic signature"
    )


def run(options: Namespace, settings: Settings) -> int:
    if options.record and not options.by:
        raise InputError("nobody is named", where="'verify'", accepted="--by NAME beside --record")
    told = quietly if not sys.stderr.isatty() else tell
    report = verify(settings, options.what, heads=options.heads, tell=told)
    for line in report.lines:
        print(f"{'ok    ' if line.ok else 'FAILED'}  {line.text}")
    if options.record:
        print(record(options, settings, report))
    return 0 if report.ok else AccuracyNotReached.exit_code


def tell(progress: Progress) -> None:
    """Where a long verification has come to, for whoever waits at a terminal."""
    print(f"{progress.done + 1} of {progress.total}: {progress.part}", file=sys.stderr)


def record(options: Namespace, settings: Settings, report: CheckReport) -> str:
    with at_desk(settings, options.what) as desk:
        done = record_verification(desk, report, by=options.by, heads=options.heads)
    return "Recorded." if done else "Not recorded: something was found, or the file may only be read."


COMMAND = Command(arguments, run, example="verify Q17.trial --record --by 'Jane Roe'")
