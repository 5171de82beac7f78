"""`refuse TRIAL FILE... --cutoff DATE [--extracted DATE] [--kind KIND] --by NAME`"""

from __future__ import annotations

from argparse import ArgumentParser, Namespace

from app.actions.receive import Incoming
from app.actions.refuse import record_refusal
from app.cli.at_desk import at_desk
from app.cli.files import uploaded
from app.cli.parsing import Command
from app.cli.receive import extract_arguments
from app.settings import Settings


def arguments(parser: ArgumentParser) -> None:
    extract_arguments(parser)
    parser.add_argument(
        "--by", required=True, metavar="NAME", help="who records it; not an electronic signature"
    )


def run(options: Namespace, settings: Settings) -> int:
    files = tuple(map(uploaded, options.files))
    incoming = Incoming(files, options.cutoff, options.extracted, options.kind)
    with at_desk(settings, options.trial) as desk:
        understood = record_refusal(desk, incoming, by=options.by)
    print("The refusal is recorded: names, digests and these sentences, and nothing of the files.")
    for finding in understood.extract.blocking:
        print(f"  {finding}")
    return 0


COMMAND = Command(arguments, run, example="refuse Q17.trial adtte-4.csv --cutoff 2027-01-08 --by 'Jane Roe'")
