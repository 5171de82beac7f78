"""`evaluate PLAN --look FILE[,FILE] [--cutoff DATE] [--kind KIND] ... [--hazard-ratio RATIO] [--json]`"""

from __future__ import annotations

import sys
from argparse import Action, ArgumentParser, Namespace
from dataclasses import dataclass, replace
from datetime import date
from pathlib import Path
from typing import Any

from app.actions.calculate import LookGiven, evaluate
from app.cli import said
from app.cli.files import read_file, uploaded
from app.cli.look_text import as_text
from app.cli.parsing import Command, day_of, hazard_ratio, kind
from app.errors import InputError
from app.model.extract import LookKind
from app.record.text import record_bytes
from app.settings import Settings


@dataclass(frozen=True)
class LookNamed:
    """One --look with the options that came after it."""

    files: tuple[Path, ...]
    cutoff: date | None = None
    kind: LookKind | None = None


class NewLook(Action):
    """--look begins a look; the options after it belong to it."""

    def __call__(
        self, parser: Any, namespace: Namespace, values: Any, option_string: str | None = None
    ) -> None:
        files = tuple(Path(part) for part in values.split(",") if part)
        namespace.looks = (*namespace.looks, LookNamed(files))


class OfLastLook(Action):
    """--cutoff and --kind belong to the --look before them, each once."""

    def __call__(
        self, parser: Any, namespace: Namespace, values: Any, option_string: str | None = None
    ) -> None:
        if not namespace.looks:
            raise no_look_before(str(option_string))
        *before, last = namespace.looks
        if getattr(last, self.dest) is not None:
            raise InputError(
                "one look has the same option twice",
                where=f"'evaluate', look {len(namespace.looks)}",
                found=f"{option_string} for a second time",
                remedy="Give each --look its own options after it",
            )
        namespace.looks = (*before, replace(last, **{self.dest: values}))


class Once(Action):
    """An option of the whole command, given once."""

    def __call__(
        self, parser: Any, namespace: Namespace, values: Any, option_string: str | None = None
    ) -> None:
        if getattr(namespace, self.dest) is not None:
            raise InputError(
                "an option is given twice",
                where="'evaluate'",
                found=f"{option_string} for a second time",
                accepted="one for all looks",
                remedy="Run the command once for each",
            )
        setattr(namespace, self.dest, values)


def no_look_before(option: str) -> InputError:
    return InputError(
        "an option stands before the look it belongs to",
        where="'evaluate'",
        found=f"{option} before any --look",
        accepted=f"--look FILE {option} VALUE",
        remedy="Write it after its --look",
    )


def arguments(parser: ArgumentParser) -> None:
    parser.add_argument("plan", metavar="PLAN", type=Path, help="the plan, a TOML file")
    parser.add_argument(
        "--look",
        dest="looks",
        action=NewLook,
        required=True,
        default=(),
        metavar="FILE[,FILE]",
        help="the extract of one look; repeat it for each look, in their order",
    )
    parser.add_argument(
        "--cutoff",
        action=OfLastLook,
        type=day_of("--cutoff"),
        metavar="DATE",
        help="data cutoff of the --look before it",
    )
    parser.add_argument(
        "--kind",
        action=OfLastLook,
        type=kind,
        metavar="KIND",
        help="planned, unplanned, safety or final: the kind of the --look before it",
    )
    parser.add_argument(
        "--hazard-ratio",
        action=Once,
        type=hazard_ratio,
        metavar="RATIO",
        help="what if this were the truth: conditional power at each look also under this hazard ratio, "
        "experimental / control",
    )
    parser.add_argument("--json", action="store_true", help="print the record at full precision")


def run(options: Namespace, settings: Settings) -> int:
    plan = read_file(options.plan)
    looks = [LookGiven(tuple(map(uploaded, look.files)), look.cutoff, look.kind) for look in options.looks]
    record = evaluate(
        settings,
        plan_name=options.plan.name,
        plan=plan,
        looks=looks,
        hazard_ratio=options.hazard_ratio,
    )
    for finding in record["findings"]:
        print(said.finding(finding), file=sys.stderr)
    sys.stdout.write(record_bytes(record).decode("utf-8") if options.json else as_text(record))
    return 0


COMMAND = Command(
    arguments,
    run,
    example="evaluate plan.toml --look adtte-1.csv --cutoff 2026-01-09 --look adtte-2.csv --hazard-ratio 0.8",
)
