"""`validate [--json]`"""

from __future__ import annotations

import json
import sys
from argparse import ArgumentParser, Namespace
from collections.abc import Sequence

from app.actions.calculate import validate
from app.cli.columns import aligned
from app.cli.parsing import Command
from app.errors import AccuracyNotReached
from app.settings import Settings
from app.validation.rows import RowOutcome


def arguments(parser: ArgumentParser) -> None:
    parser.add_argument("--json", action="store_true", help="print every row at full precision")


def run(options: Namespace, settings: Settings) -> int:
    outcomes = validate()
    sys.stdout.write(as_json(outcomes) if options.json else as_text(outcomes))
    return 0 if all(outcome.agrees for outcome in outcomes) else AccuracyNotReached.exit_code


def as_text(outcomes: Sequence[RowOutcome]) -> str:
    """What was printed beside what is computed, publication by publication."""
    rows = [
        (
            outcome.row.quantity,
            outcome.row.expected,
            f"{outcome.computed:.10g}",
            "agrees" if outcome.agrees else "DIFFERS",
        )
        for outcome in outcomes
    ]
    n_agreeing = sum(outcome.agrees for outcome in outcomes)
    sources = "\n".join(
        dict.fromkeys(f"{outcome.row.publication} ({outcome.row.mark})" for outcome in outcomes)
    )
    return (
        f"{aligned(('Quantity', 'Printed', 'Computed', 'To the printed digits'), rows)}\n"
        f"Sources:\n{sources}\n\n{n_agreeing} of {len(outcomes)} agree to the printed digits.\n"
    )


def as_json(outcomes: Sequence[RowOutcome]) -> str:
    rows = [
        {
            "quantity": outcome.row.quantity,
            "publication": outcome.row.publication,
            "mark": outcome.row.mark,
            "note": outcome.row.note,
            "expected": outcome.row.expected,
            "tolerance": outcome.row.tolerance,
            "computed": outcome.computed,
            "agrees": outcome.agrees,
        }
        for outcome in outcomes
    ]
    return json.dumps({"format": 1, "kind": "validate", "rows": rows}, ensure_ascii=False, indent=1) + "\n"


COMMAND = Command(arguments, run, example="validate")
