"""`boundary PLAN [--at 0.3,0.6] [--final] [--json]`"""

from __future__ import annotations

import sys
from argparse import ArgumentParser, Namespace
from pathlib import Path
from typing import Any

from app.actions.calculate import boundary
from app.cli import said
from app.cli.columns import aligned
from app.cli.files import read_file
from app.cli.parsing import Command, fractions
from app.record.text import record_bytes
from app.settings import Settings

HEADS = ("Look", "Fraction", "Events", "Alpha spent", "Bound as z", "as one-sided p", "as hazard ratio")


def arguments(parser: ArgumentParser) -> None:
    parser.add_argument("plan", metavar="PLAN", type=Path, help="the plan, a TOML file")
    parser.add_argument(
        "--at",
        metavar="FRACTIONS",
        type=fractions,
        help="information fractions, as in 0.3,0.6; default: the plan's looks",
    )
    parser.add_argument(
        "--final", action="store_true", help="the last of them is the final look and spends what is left"
    )
    parser.add_argument("--json", action="store_true", help="print the record at full precision")


def run(options: Namespace, settings: Settings) -> int:
    plan = read_file(options.plan)
    record = boundary(
        settings, plan_name=options.plan.name, plan=plan, fractions=options.at, final=options.final
    )
    for finding in record["findings"]:
        print(said.finding(finding), file=sys.stderr)
    sys.stdout.write(record_bytes(record).decode("utf-8") if options.json else as_text(record))
    return 0


def as_text(record: dict[str, Any]) -> str:
    """One row a look, then what the design needs and expects."""
    looks = record["looks"]
    extra = [kind for kind in ("futility", "harm") if looks[0][f"{kind}_z"] is not None]
    heads = (*HEADS, *(f"{kind.capitalize()} as z" for kind in extra))
    rows = [(*bound_row(look), *(said.bound(look[f"{kind}_z"], 4) for kind in extra)) for look in looks]
    return f"{aligned(heads, rows)}\n{design_text(record)}{hypotheses_text(record)}"


def hypotheses_text(record: dict[str, Any]) -> str:
    """The bounds of each further hypothesis by its own events, and the level of all together."""
    if record["hypotheses"] is None:
        return ""
    sides = "one-sided" if record["sides"] == 1 else "two-sided"
    blocks = [
        f"\n{each['name']}, {sides} alpha {said.alpha(each['alpha'])}, {waiting_text(each)}\n"
        f"{aligned(HEADS, [bound_row(look) for look in each['looks']])}"
        for each in record["hypotheses"]
    ]
    return f"{''.join(blocks)}\nAll hypotheses together: {sides} alpha {said.alpha(record['alpha_of_all'])}\n"


def waiting_text(hypothesis: dict[str, Any]) -> str:
    after = hypothesis["after"]
    return "tested at once" if after is None else f"tested once {said.hypothesis(after)} has crossed"


def bound_row(look: dict[str, Any]) -> tuple[str, ...]:
    p = look["efficacy_p_one_sided"]
    return (
        f"{look['number']}{' final' if look['final'] else ''}",
        said.number(look["information_fraction"]),
        str(look["events"]),
        said.alpha(look["alpha_spent"]),
        said.bound(look["efficacy_z"], 4),
        "-" if isinstance(p, dict) else said.p_value(p)[0],
        said.bound(look["efficacy_hazard_ratio"]),
    )


def design_text(record: dict[str, Any]) -> str:
    expected, fixed = record["expected_information_fraction"], record["fixed_design_events"]
    side = "of each side; the test is two-sided" if record["sides"] == 2 else "one-sided"
    lines = (
        ("Alpha spent", f"cumulative, {side}"),
        ("Power", f"{said.percent(record['power'])}%"),
        ("Noncentrality of z at full information", said.number(record["noncentrality"], 4)),
        ("Information over a fixed design's", said.number(record["inflation"], 4)),
        ("Expected fraction, no effect", said.number(expected["null"])),
        ("Expected fraction, half the effect", said.number(expected["half"])),
        ("Expected fraction, design effect", said.number(expected["design"])),
        ("Power with the planned events", f"{said.percent(record['power_reached'])}%"),
        ("Events needed for the power", str(record["events_needed"])),
        ("Events for one look, Schoenfeld", said.number(fixed["schoenfeld"], 1)),
        ("Events for one look, Freedman", said.number(fixed["freedman"], 1)),
    )
    return "".join(f"{term:<40}{value}\n" for term, value in lines)


COMMAND = Command(arguments, run, example="boundary plan.toml --at 0.3,0.6")
