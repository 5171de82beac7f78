"""Where everything on the spine stands: places in thousandths of the rail, as classes of the style sheet."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from app.render.svg.geometry import apart_within
from app.render.svg.lettering import fraction_text
from app.sheets.blocks import CountedBy, Spine, SpineLook
from app.sheets.held import HELD_BEFORE

ROOMY = 36 / 560  # two lines of words, on the shortest rail that is common
CLOSE = 20 / 560  # one line


@dataclass(frozen=True)
class SpineMark:
    """One look on the spine: where its disc and its words stand, and what is said of it."""

    look: SpineLook
    place: str
    words_place: str
    leader: str  # "up" or "down" to words that had to give way, or ""
    bracket: str  # place of the planned fraction that this look used, or ""
    numbers: str
    further: str  # what only a screen reader needs to be told

    @property
    def is_held(self) -> bool:
        return self.look.state != "planned"

    @property
    def classes(self) -> str:
        return " ".join(
            name
            for name, applies in (
                (self.place, True),
                ("held", self.is_held),
                ("ahead", not self.is_held),
                ("before", self.look.state == "held before"),
                ("shown", self.look.shown),
                ("safety", self.look.kind == "safety"),
                ("crossing", self.look.crossed in ("efficacy", "control")),
            )
            if applies
        )


@dataclass(frozen=True)
class SpineTick:
    """A planned fraction at the left of the rail."""

    place: str
    text: str
    ticked: bool


@dataclass(frozen=True)
class SpineMarks:
    """A spine ready to be set."""

    marks: tuple[SpineMark, ...]
    ticks: tuple[SpineTick, ...]
    filled: str
    so_far: str
    dense: bool
    by: str

    @property
    def places(self) -> frozenset[str]:
        """Every position class in use."""
        of_marks = {p for m in self.marks for p in (m.place, m.words_place, m.bracket) if p}
        return frozenset({*of_marks, *(tick.place for tick in self.ticks), self.filled})


def spine_marks(spine: Spine) -> SpineMarks:
    """The rail runs from 0 to 1, or on to the last look when information has run over."""
    end = max([1.0, *(look.fraction for look in spine.looks)])
    shown = next((look for look in spine.looks if look.shown), None)
    dense = len(spine.looks) * ROOMY > 1
    words_at = _words_at([look.fraction / end for look in spine.looks], CLOSE if dense else ROOMY)
    return SpineMarks(
        marks=tuple(_mark(look, at, end, spine.by) for look, at in zip(spine.looks, words_at, strict=True)),
        ticks=tuple(
            SpineTick(place_of(fraction / end), fraction_text(fraction), 0 < fraction < 1)
            for fraction in sorted({0.0, *spine.planned, 1.0})
        ),
        filled=place_of((shown.fraction if shown else 0.0) / end),
        so_far=f"{shown.fraction:.3f} · {shown.events} of {spine.planned_events} planned events"
        if shown
        else "",
        dense=dense,
        by=f" by {spine.by}" if spine.by else "",
    )


def _words_at(fractions: Sequence[float], gap: float) -> tuple[float, ...]:
    return apart_within(fractions, min(gap, 1 / max(len(fractions), 1)), 0.0, 1.0)


def _mark(look: SpineLook, words_at: float, end: float, by: CountedBy) -> SpineMark:
    here, there = place_of(look.fraction / end), place_of(words_at)
    return SpineMark(
        look=look,
        place=here,
        words_place=there,
        leader="" if here == there else "down" if words_at > look.fraction / end else "up",
        bracket="" if look.planned is None or look.state == "planned" else place_of(look.planned / end),
        numbers=_numbers(look, by),
        further=_further(look),
    )


def _numbers(look: SpineLook, by: CountedBy) -> str:
    """Where information is score variance, how many events a planned look will have is foreseen only."""
    if look.state == "planned":
        events = f"{'about ' if by == 'score variance' else ''}{look.events} events"
        return f"final, {events}" if look.kind == "final" else events
    return f"{look.fraction:.3f} · {look.events} events"


def _further(look: SpineLook) -> str:
    """The rest of "Look 3, information fraction 0.714, 384 events, planned 0.75, open".

    A look held before is told in full, with the source of its numbers on the closed side.
    """
    planned = "" if look.planned is None else f", planned {fraction_text(look.planned)}"
    kind = "" if look.kind == "planned" else f", {look.kind}"
    crossed = "" if look.crossed == "none" else f", {look.crossed} crossed"
    state = f"{HELD_BEFORE}, {look.source}" if look.source else HELD_BEFORE
    return f"{planned}{kind}, {state if look.state == 'held before' else look.state}{crossed}"


def place_of(part: float) -> str:
    """The class of a place on the rail, exact to the printed third decimal."""
    return f"t{round(1000 * min(max(part, 0.0), 1.0)):03d}"
