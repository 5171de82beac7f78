"""A process whose children carry out whole acts of a person and kill themselves before step n, for every n.

Run as `python killed_acts.py FOLDER`. A step is a statement of the trial file's connection, or the naming
of a report's file. Prints a JSON line for each child: the act, its folder, whether it lived to say that the
act was done, and the entries before.
"""

from __future__ import annotations

import json
import os
import sys
from collections.abc import Callable, Iterator
from datetime import UTC, datetime
from itertools import count
from pathlib import Path

from app.actions.amend import amend
from app.actions.correct import erratum
from app.actions.demo import make_demo
from app.actions.desk import Desk
from app.actions.freeze import freeze
from app.actions.receive import receive
from app.actions.recommend import recommend
from app.actions.refuse import record_refusal
from app.actions.report import write_report
from app.actions.unmask import unmask
from app.settings import Settings
from tests.actions import given
from tests.ledger.killed import dying_at, lives

SETTINGS = Settings(clock=lambda: datetime(2026, 11, 2, 9, 30, tzinfo=UTC))

Deed = Callable[[Desk], object]

DEEDS: dict[str, Deed] = {
    "freeze": lambda desk: freeze(desk, by=given.BY),
    "freeze and receive": lambda desk: receive(
        desk, given.FOURTH, acknowledgements=given.REASONS, by=given.BY, freeze_open=True
    ),
    "amend": lambda desk: amend(
        desk, plan_name="plan-2.toml", plan=given.revised_plan(), reason="Accrual", by=given.BY
    ),
    "refuse": lambda desk: record_refusal(desk, given.BLOCKED, by=given.BY),
    "recommend": lambda desk: recommend(desk, advice="continue", reason="No concern", by=given.BY),
    "correct": lambda desk: erratum(desk, entry=1, correction="No", by=given.BY),
    "unmask": lambda desk: unmask(desk, reason="Asked for", by=given.BY),
    "write report": lambda desk: write_report(desk, 2, desk.path.parent / "report"),
}


AFTER_A_HELD_LOOK: dict[str, Deed] = {
    "freeze after a held look": DEEDS["freeze"],
    "freeze and receive after a held look": DEEDS["freeze and receive"],
}


def main(folder: Path) -> None:
    demo, held = folder / "demo.trial", folder / "held.trial"
    make_demo(SETTINGS, demo)
    given.start_after_a_held_look(SETTINGS, held)
    for trial, deeds in ((demo, DEEDS), (held, AFTER_A_HELD_LOOK)):
        with Desk.open(SETTINGS, trial) as desk:
            n_entries = len(desk.trial.entries())
        for name, deed in deeds.items():
            for own, done in deaths(folder / name, trial.read_bytes(), deed):
                death = {"act": name, "folder": str(own), "done": done, "entries_before": n_entries}
                print(json.dumps(death))


def deaths(folder: Path, trial: bytes, deed: Deed) -> Iterator[tuple[Path, bool]]:
    for n in count(1):
        own = folder / str(n)
        own.mkdir(parents=True)
        (own / "Q17.trial").write_bytes(trial)
        done = lives(lambda own=own, n=n: carry_out(own / "Q17.trial", deed, n))
        yield own, done
        if done:
            return


def carry_out(path: Path, deed: Deed, n: int) -> None:
    trace, rename = dying_at(n), os.replace
    os.replace = lambda *names: (trace(), rename(*names), trace())
    with Desk.open(SETTINGS, path) as desk:
        desk.trial._database._connection.set_trace_callback(trace)
        deed(desk)
        desk.trial._database._connection.set_trace_callback(None)


if __name__ == "__main__":
    main(Path(sys.argv[1]))
