"""The invented trial looked at: its views and books of sheets, made from its extracts without a file."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, fields, is_dataclass, replace
from datetime import date
from typing import Any

from app.intake.extract import received_file
from app.ledger.bodies import SnapshotReceived
from app.ledger.history import Look, PlanVersion, State
from app.model.extract import Acknowledgement, Extract, LookKind, Snapshot
from app.model.look import LookResult
from app.model.plan import Plan
from app.model.values import Absent
from app.review import LookDeclared, as_used, review_look
from app.review.held import held_looks
from app.review.look import planned_fraction
from app.review.received import Delivery, review_delivery
from app.settings import Limits
from app.sheets.blocks import LookBook, Sheet, Span
from app.sheets.book import closed_book
from app.sheets.frame import LookOnFile, Surroundings
from app.sheets.record import History
from app.views.closed import ClosedView, Letters, full_view, masked_view, unmasked_view
from tests.unit.review.invented_trial import (
    CUTOFFS,
    DEATH_AFTER_RELAPSE,
    FIRST_DAY,
    HARM_ON_DEATH,
    Patients,
    patients,
    plan,
    two_endpoints,
)

FURTHER = ("[enrolment]", f"{HARM_ON_DEATH}{DEATH_AFTER_RELAPSE}[enrolment]")
"""A change of the plan: harm on death, and death as a hypothesis after the plan's own."""
A_IS_CONTROL, A_IS_EXPERIMENTAL = Letters("A"), Letters("B")
TWO_SIDED = ("alpha = 0.025\nsides = 1", "alpha = 0.05\nsides = 2")


@dataclass(frozen=True, eq=False)
class Held:
    """One look of the trial as it was computed, with what it was made from."""

    plan: Plan
    result: LookResult
    snapshot: Snapshot
    extract: Extract

    def view(self, letters: Letters | None = None) -> ClosedView:
        """Unmasked without letters, masked with them."""
        if letters is None:
            return unmasked_view(self.result, self.plan, A_IS_CONTROL)
        return masked_view(self.result, self.plan, letters)


def held(
    under: Plan | None = None,
    people: Patients | None = None,
    cutoffs: Sequence[date] = CUTOFFS,
    kinds: Sequence[LookKind] = (),
) -> tuple[Held, ...]:
    """The looks at these cutoffs, one after the other; `kinds` are planned unless said."""
    under, people = under or plan(), people or patients()
    looks: list[Held] = []
    earlier: Delivery | None = None
    before, compared = held_looks(under)
    for at_cutoff, cutoff in enumerate(cutoffs):
        number = 1 + len(before) + at_cutoff
        kind = kinds[at_cutoff] if at_cutoff < len(kinds) else "planned"
        content = two_endpoints(people, cutoff) if under.further_endpoints else people.at(cutoff).csv()
        file = received_file(f"adtte-{number}.csv", content)
        delivery = Delivery((file,), kind, cutoff)
        past = [*before, *(as_used(look.result) for look in looks)]
        reviewed = review_delivery(
            under, delivery, earlier, past, number=number, limits=Limits(), held=compared
        )
        reasons = tuple(Acknowledgement(doubt.id, "Known") for doubt in reviewed.extract.doubts)
        at = f"{cutoff}T09:00:00Z"
        snapshot = Snapshot(number, (file,), kind, cutoff, None, at, "M. Berg", reasons)
        looks.append(Held(under, reviewed.result, snapshot, reviewed.extract))
        earlier = delivery
    return tuple(looks)


def with_z(look: LookResult, z: float) -> LookResult:
    """The same look, had its test given this z for experimental, and -z for control."""
    assert not isinstance(look.logrank, Absent)
    direct = replace(look.logrank, z=z)
    return replace(look, logrank=direct, mirrored=replace(look.mirrored, logrank=replace(direct, z=-z + 0.0)))


def life(*zs: float, sides: int = 1) -> list[LookResult]:
    """Looks of the invented trial with these z's in place of their own, each resting on those before."""
    under = plan(*([TWO_SIDED] if sides == 2 else []))
    looks: list[LookResult] = []
    for number, (cutoff, z) in enumerate(zip(CUTOFFS, zs, strict=False), 1):
        past = [as_used(look) for look in looks]
        look = review_look(under, patients().at(cutoff).sample(), LookDeclared(number, "planned"), past)
        look = with_z(look, z)
        verdict = full_view(look, under).readings[0].verdict
        looks.append(replace(look, verdict=verdict))
    return looks


def surroundings(looks: Sequence[Held]) -> Surroundings:
    design, before = looks[0].plan.design, len(looks[0].plan.held)
    kinds: list[LookKind] = [*(["planned"] * before), *(look.result.kind for look in looks)]  # type: ignore[list-item]
    held_before = (
        LookOnFile(
            number=held.number,
            kind="planned",
            fraction=held.events / design.planned_events,
            events=held.events,
            state="held before",
            planned=planned_fraction(design.looks, kinds[: held.number]),
        )
        for held in looks[0].plan.held
    )
    on_file = (
        LookOnFile(
            number=look.result.number,
            kind=look.result.kind,
            fraction=look.result.information.fraction,
            events=look.result.information.events,
            state="open",
            planned=planned_fraction(design.looks, kinds[: look.result.number]),
        )
        for look in looks
    )
    on_spine = (*held_before, *on_file)
    return Surroundings(on_spine, design.looks, design.planned_events, 1, looks[-1].snapshot.cutoff)


LOCKED = PlanVersion(1, "", entry=1, at="2024-01-01T09:00:00Z", by="M. Berg")


def book(looks: Sequence[Held], letters: Letters | None = None) -> LookBook:
    """All sheets of the last of these looks, for the closed side."""
    on_file = tuple(
        Look(SnapshotReceived.of(look.snapshot, look.extract.findings), look.snapshot.received_at, LOCKED)
        for look in looks
    )
    before = len(looks[0].plan.held)
    state = State(
        looks=on_file,
        looks_held_before=before,
        locked_at=f"{FIRST_DAY}T09:00:00Z",
        locked_by="M. Berg",
        plans=(LOCKED,),
    )
    history = History(state, ())
    last = looks[-1]
    return closed_book(last.view(letters), surroundings(looks), last.snapshot, last.extract, history)


def text(line: Sequence[Span]) -> str:
    """A line as it is read, spaces that do not break as plain ones."""
    return "".join(span.text for span in line).replace("\u00a0", " ").replace("\u2011", "-")


def answers(sheet: Sheet) -> list[str]:
    return [text(answer) for answer in sheet.answer]


def table_texts(sheet: Sheet, caption: str) -> dict[str, list[str]]:
    """Row heads and cells of the one table whose caption begins so."""
    tables = (*sheet.tables, *sheet.wide_tables, *sheet.folded, *filter(None, [sheet.figure_table]))
    (table,) = [each for each in tables if text(each.caption).startswith(caption)]
    return {text(row.head): [text(cell.line) for cell in row.cells] for row in table.rows}


def parts(value: Any, kind: type) -> Iterator[Any]:
    """Every part of this kind anywhere in a value made of dataclasses and tuples."""
    if isinstance(value, kind):
        yield value
    elif is_dataclass(value) and not isinstance(value, type):
        for field in fields(value):
            yield from parts(getattr(value, field.name), kind)
    elif isinstance(value, tuple | list):
        for item in value:
            yield from parts(item, kind)
    elif isinstance(value, dict):
        for item in value.values():
            yield from parts(item, kind)
