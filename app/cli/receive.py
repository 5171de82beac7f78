"""`receive TRIAL FILE... --cutoff DATE [--extracted DATE] [--kind KIND] [--acknowledge ID=REASON]`"""

from __future__ import annotations

import sys
from argparse import ArgumentParser, Namespace
from pathlib import Path

from app.actions.receive import Incoming, Understanding, receive, understand
from app.cli import said
from app.cli.at_desk import at_desk
from app.cli.files import uploaded
from app.cli.parsing import Command, acknowledgement, day_of, kind
from app.model.extract import Changes, ReadingOfFile
from app.settings import Settings


def extract_arguments(parser: ArgumentParser) -> None:
    """The trial file, the files of an extract, and what is declared about it."""
    parser.add_argument("trial", metavar="TRIAL", type=Path, help="the trial file")
    parser.add_argument("files", metavar="FILE", type=Path, nargs="+", help="the files of the extract")
    parser.add_argument(
        "--cutoff", type=day_of("--cutoff"), required=True, metavar="DATE", help="data cutoff"
    )
    parser.add_argument(
        "--extracted",
        type=day_of("--extracted"),
        metavar="DATE",
        help="when the extract was taken, if it is known",
    )
    parser.add_argument(
        "--kind",
        type=kind,
        default="planned",
        metavar="KIND",
        help="planned (the default), unplanned, safety or final; it cannot be changed later. A final look "
        "spends all alpha that is left; ending early because of comparative results does not release it",
    )


def arguments(parser: ArgumentParser) -> None:
    extract_arguments(parser)
    parser.add_argument(
        "--acknowledge",
        type=acknowledgement,
        action="append",
        default=[],
        metavar="ID=REASON",
        help="let a doubt stand, with the reason why; once for each doubt",
    )
    parser.add_argument(
        "--by", required=True, metavar="NAME", help="who receives it; not an electronic signature"
    )


def run(options: Namespace, settings: Settings) -> int:
    files = tuple(map(uploaded, options.files))
    incoming = Incoming(files, options.cutoff, options.extracted, options.kind)
    with at_desk(settings, options.trial) as desk:
        tell(understand(desk, incoming))
        look = receive(desk, incoming, acknowledgements=dict(options.acknowledge), by=options.by)
    print(f"Received as look {look}. It is open until it is frozen.")
    return 0


def tell(understood: Understanding) -> None:
    """What was understood on standard output, doubts and notes on standard error; what blocks is raised."""
    sys.stdout.write(as_text(understood))
    said.tell(understood.extract.findings)


def as_text(understood: Understanding) -> str:
    """What was understood, before anything is stored."""
    lines = [line for file in understood.extract.files for line in file_lines(file)]
    if understood.subjects is not None and understood.events is not None and understood.fraction is not None:
        lines.append(
            f"{understood.subjects} subjects, {understood.events} events, "
            f"information fraction {said.number(understood.fraction)}"
            f"{f' by {understood.by}' if understood.by else ''}"
        )
    if understood.changes is not None:
        lines.append(changes_text(understood.changes))
    return "".join(f"{line}\n" for line in lines)


def file_lines(file: ReadingOfFile) -> list[str]:
    """A file as it was read; what was left out is listed, since nobody else will look at it."""
    read, left_out = ", ".join(file.columns_read), ", ".join(file.columns_left_out)
    return [
        f"{file.name}: {file.n_rows} rows; columns read: {read or 'none'}; not read: {left_out or 'none'}",
        f"  sha256 {file.digest}",
    ]


def changes_text(changes: Changes) -> str:
    """Counts only, each under one denominator: identifiers belong to the page, not to a terminal."""
    counts = (
        (changes.new_events, "new events"),
        (changes.reversed_events, "reversed"),
        (changes.moved_events, "moved"),
        (changes.changed_arm, "changed arm"),
        (changes.changed_stratum, "changed stratum"),
    )
    in_both = ", ".join(f"{len(subjects)} {noun}" for subjects, noun in counts)
    return (
        f"Since the last snapshot: {len(changes.new_subjects)} new subjects, "
        f"{len(changes.vanished_subjects)} vanished; of {changes.n_common} in both: {in_both}"
    )


COMMAND = Command(
    arguments,
    run,
    example="receive Q17.trial adtte-4.csv --cutoff 2027-01-08 --extracted 2027-01-15 --by 'Jane Roe'",
)
