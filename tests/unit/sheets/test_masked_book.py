"""A masked book and a masked record name no arm, whatever the look holds."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from app.record.text import record_bytes
from app.sheets.blocks import ArmLabel
from app.views.record import looks_record
from tests.unit.review.invented_trial import CUTOFFS, Patients, held_before, patients, plan
from tests.unit.sheets.invented_looks import (
    A_IS_CONTROL,
    A_IS_EXPERIMENTAL,
    FURTHER,
    TWO_SIDED,
    book,
    held,
    parts,
    text,
)


def without_events_in_one_arm() -> Patients:
    people = patients()
    return replace(people, time=np.where(people.experimental, 9999.0, people.time))


WORLDS = {
    "further endpoints": (plan(FURTHER), patients()),
    "crossed": (plan(), patients()),
    "two sides": (plan(TWO_SIDED), patients()),
    "no ratio": (plan(), without_events_in_one_arm()),
    "held before": (plan(held_before(1.5, -0.25)), patients()),
    "two to one": (plan(("allocation = [1, 1]", "allocation = [1, 2]")), patients()),
}


@pytest.mark.parametrize("world", WORLDS)
@pytest.mark.parametrize(
    "letters", [A_IS_CONTROL, A_IS_EXPERIMENTAL], ids=["A is control", "A is experimental"]
)
def test_nothing_masked_names_an_arm(world: str, letters: object) -> None:
    under, people = WORLDS[world]
    looks = held(under, people)
    for number in range(1, len(looks) + 1):
        view = looks[number - 1].view(letters)  # type: ignore[arg-type]
        record = record_bytes(looks_record("look", [view], run_at="")).decode()
        shown = repr(book(looks[:number], letters))  # type: ignore[arg-type]
        for word in ("pelletol", "syrupine", "control arm", "experimental arm"):
            assert word not in record.lower()
            assert word not in shown.lower()


@pytest.mark.parametrize("world", WORLDS)
def test_masked_sheets_are_the_same_whichever_letter_is_experimental(world: str) -> None:
    """The same patients under A and under B, whatever the plan calls them, its allocation with them."""
    under, people = WORLDS[world]
    if under.arms.unequal:
        under = replace(under, arms=replace(under.arms, allocation=under.arms.allocation[::-1]))
        there = WORLDS[world][0]
    else:
        there = under
    one, other = held(there, people), held(under, people.with_arms_exchanged())
    for number in range(1, len(one) + 1):
        seen, exchanged = book(one[:number], A_IS_CONTROL), book(other[:number], A_IS_EXPERIMENTAL)
        for key in ("glance", "information", "curves", "boundary", "shape", "outlook"):
            if under.arms.unequal and key == "information":
                continue  # it tells the ratio as the plan writes it
            assert seen.sheet(key) == exchanged.sheet(key)


def test_unmasked_the_names_do_stand_there() -> None:
    """The search above finds what there is to find."""
    shown = repr(book(held()[:1]))
    assert "Pelletol" in shown
    assert "syrupine" in shown


@pytest.mark.parametrize("letters", [A_IS_CONTROL, A_IS_EXPERIMENTAL])
def test_arms_stand_in_the_order_of_their_letters(letters: object) -> None:
    labels = list(parts(book(held()[:2], letters), ArmLabel))  # type: ignore[arg-type]
    assert {label.letter for label in labels} == {"A", "B"}
    pairs = list(zip(labels[::2], labels[1::2], strict=True))
    assert all(
        (first.letter, second.letter) in (("A", "B"), ("A", "A"), ("B", "B")) for first, second in pairs
    )


def test_with_unequal_allocation_the_page_says_that_counts_identify_the_letters() -> None:
    under, people = WORLDS["two to one"]
    said = "The plan allocates 1:2 (control : experimental): the numbers of subjects identify the letters."
    masked = book(held(under, people, cutoffs=CUTOFFS[:1]), A_IS_CONTROL).sheet("information")
    equal = book(held(cutoffs=CUTOFFS[:1]), A_IS_CONTROL).sheet("information")
    assert masked is not None
    assert equal is not None
    assert said in [text(note) for note in masked.notes]
    assert said not in [text(note) for note in equal.notes]
