"""The versions of the plan: which looks each governs, what it changed key by key, who decided it and when."""

from __future__ import annotations

from typing import Protocol

from app.ledger.bodies import PlanAmended
from app.ledger.history import PlanVersion, State
from app.sheets.blocks import Cell, Column, Row, Table
from app.sheets.words import count, line, listed, moment

NOBODY = "no look's results had been opened"


def plan_tables(state: State) -> tuple[Table, ...]:
    """Nothing while the plan is as it was locked."""
    amended = [version.amended for version in state.plans if version.amended]
    return (_versions_table(state), _changes_table(amended)) if amended else ()


def _versions_table(state: State) -> Table:
    columns = ("since", "looks held under it", "why", "decided by", "known before")
    return Table(
        line("Plan versions"),
        tuple(Column(line(head), "words") for head in columns),
        tuple(_version_row(state, version) for version in state.plans),
        line("Version"),
        note=line("A version governs the looks whose snapshots were received while it was the last."),
    )


def _version_row(state: State, version: PlanVersion) -> Row:
    looks = [str(look.number) for look in state.looks if look.plan.version == version.version]
    amended = version.amended
    words = (
        moment(version.at),
        listed(looks) or "none",
        amended.reason if amended else "as locked",
        amended.decided_by if amended else version.by,
        known_before(amended) if amended else NOBODY,
    )
    return Row((count(version.version),), tuple(Cell(line(text)) for text in words))


class Knowing(Protocol):
    """An amendment, recorded or about to be."""

    @property
    def results_opened(self) -> tuple[int, ...]: ...

    @property
    def unmasked(self) -> bool: ...


def known_before(amended: Knowing) -> str:
    """ "results of looks 1 and 2 had been opened, arms masked": what an amendment was made in sight of."""
    if not amended.results_opened:
        return NOBODY
    looks = [str(look) for look in amended.results_opened]
    arms = "unmasked" if amended.unmasked else "masked"
    return f"results of look{'s' if len(looks) > 1 else ''} {listed(looks)} had been opened, arms {arms}"


def _changes_table(amended: list[PlanAmended]) -> Table:
    rows = tuple(
        Row(
            line(change.key),
            (Cell((count(each.version),)), Cell(line(change.before)), Cell(line(change.after))),
        )
        for each in amended
        for change in each.changes
    )
    columns = (
        Column(line("version")),
        Column(line("before"), "words"),
        Column(line("from then on"), "words"),
    )
    return Table(line("What the amendments changed"), columns, rows, line("Key"))
