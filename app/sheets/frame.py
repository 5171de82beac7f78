"""The frame around every sheet of one look: dates, spine, colophon."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import date
from typing import Literal

from app.model.boundary import Crossed
from app.model.extract import LookKind
from app.sequential.design import events_by
from app.sheets.blocks import CountedBy, DateMark, PageFrame, Spine, SpineLook
from app.sheets.words import day_text, listed
from app.views.closed import ClosedView
from app.views.open import OpenView

LookState = Literal["held before", "frozen", "open"]


@dataclass(frozen=True)
class LookOnFile:
    """One look as both sides may know it, received or held before; `planned` is the fraction it used up.

    `fraction` is of what is planned by the version of the look shown: the spine has one scale.
    """

    number: int
    kind: LookKind
    fraction: float
    events: int
    state: LookState
    planned: float | None
    plan_version: int = 1


@dataclass(frozen=True)
class Surroundings:
    """What the frame needs besides the look itself. `looks` are those held before, then all received.

    Where the plan counts information in score variance, `by` says how their fractions are counted here: the
    open side has events only, since V needs the arms.
    """

    looks: tuple[LookOnFile, ...]
    planned: tuple[float, ...]
    planned_events: int
    plan_version: int
    run_on: date
    by: CountedBy = ""

    def state_of(self, number: int) -> LookState:
        return next(look.state for look in self.looks if look.number == number)

    def planned_for(self, number: int) -> float | None:
        return next(look.planned for look in self.looks if look.number == number)


def closed_frame(
    view: ClosedView, around: Surroundings, sheets: tuple[tuple[str, int | None, str], ...]
) -> PageFrame:
    look = view.look
    crossed = {
        reading.verdict.first_crossed: _crossing(view, reading.verdict.first_crossed)
        for reading in view.readings
        if reading.verdict.first_crossed is not None
    }
    return PageFrame(
        side="closed",
        disclosure="masked" if view.masked else "unmasked",
        trial_name=view.plan.trial.name,
        trial_title=view.plan.trial.title,
        dates=three_dates(look.cutoff, look.extracted, around.run_on),
        spine=spine(around, look.number, crossed, {held.number: held.source for held in look.held}),
        look=look.number,
        colophon=_colophon(around, look.number, look.kind),
        sheets=sheets,
    )


def _crossing(view: ClosedView, number: int) -> Crossed:
    """What the spine's diamond stands for; it is the same mark whichever bound was crossed."""
    for reading in view.readings:
        if number == view.look.number and reading.verdict.crossed != "none":
            return reading.verdict.crossed
        for held in reading.history:
            if held.number == number and held.crossed != "none":
                return held.crossed
    return "none"


def open_frame(
    view: OpenView, around: Surroundings, sheets: tuple[tuple[str, int | None, str], ...]
) -> PageFrame:
    look = view.look
    return PageFrame(
        side="open",
        disclosure="pooled",
        trial_name=view.trial_name,
        trial_title=view.trial_title,
        dates=three_dates(look.cutoff, look.extracted, around.run_on),
        spine=spine(around, look.number, {}, {}),  # sources are words that nobody has read for arms
        look=look.number,
        colophon=_colophon(around, look.number, look.kind),
        sheets=sheets,
    )


def spine(
    around: Surroundings, shown: int, crossed: Mapping[int, Crossed], sources: Mapping[int, str]
) -> Spine:
    held = [
        SpineLook(
            number=look.number,
            fraction=look.fraction,
            events=look.events,
            kind=look.kind,
            state=look.state,
            shown=look.number == shown,
            planned=look.planned,
            crossed=crossed.get(look.number, "none"),
            source=sources.get(look.number, ""),
        )
        for look in around.looks
    ]
    return Spine((*held, *_still_planned(around)), around.planned, around.planned_events, around.by)


def _still_planned(around: Surroundings) -> Sequence[SpineLook]:
    """The plan's looks nobody has used up yet, beyond the information reached."""
    used = {look.planned for look in around.looks}
    reached = max((look.fraction for look in around.looks), default=0.0)
    if any(look.kind == "final" or look.fraction >= 1 for look in around.looks):
        return ()
    ahead = [fraction for fraction in around.planned if fraction not in used and fraction > reached]
    first = len(around.looks) + 1
    return [
        SpineLook(
            number=first + index,
            fraction=fraction,
            events=events_by(fraction, around.planned_events),
            kind="final" if fraction == 1 else "planned",
            state="planned",
            planned=fraction,
        )
        for index, fraction in enumerate(ahead)
    ]


def three_dates(cutoff: date | None, extracted: date | None, run_on: date) -> tuple[DateMark, ...]:
    """Data cutoff, extract, run, with the days between those that are known."""
    marks: list[DateMark] = []
    last: date | None = None
    for name, day in (("Data cutoff", cutoff), ("Extract", extracted), ("Run", run_on)):
        if day is None:
            marks.append(DateMark(name, "not stated", None))
            continue
        marks.append(
            DateMark(name, day_text(day), day.isoformat(), None if last is None else (day - last).days)
        )
        last = day
    return tuple(marks)


def _colophon(around: Surroundings, number: int, kind: LookKind) -> tuple[str, ...]:
    return (f"Look {number}, {kind}, {around.state_of(number)}", versions_text(around))


def versions_text(around: Surroundings) -> str:
    """ "Plan version 2 (looks 1 and 2: version 1)": under which version the looks were held."""
    others: dict[int, list[str]] = {}
    for look in around.looks:
        if look.state != "held before" and look.plan_version != around.plan_version:
            others.setdefault(look.plan_version, []).append(str(look.number))
    held = [
        f"look{'s' if len(looks) > 1 else ''} {listed(looks)}: version {version}"
        for version, looks in sorted(others.items())
    ]
    return f"Plan version {around.plan_version}" + (f" ({'; '.join(held)})" if held else "")
