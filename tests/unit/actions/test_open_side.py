"""The open side learns nothing comparative: by construction, and by trials that differ in the arms only."""

from __future__ import annotations

import typing
from collections.abc import Iterator, Sequence
from dataclasses import fields, is_dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from app.actions.looks import closed_book, open_book
from app.model.extract import PooledSample
from app.model.look import PooledResult
from app.sheets.blocks import CurveLine, LookBook
from app.sheets.frame import Surroundings
from app.views.open import OpenView
from tests.unit.actions.invented_file import desk, held
from tests.unit.review.invented_trial import Patients, patients
from tests.unit.sheets.invented_looks import FURTHER, parts, text

ARM_WORDS = ("arm", "arms", "treatment", "experimental", "control", "letter", "letters", "masked")


def field_names(kind: Any) -> Iterator[str]:
    """The fields of a dataclass, and of every dataclass that its fields can hold."""
    if is_dataclass(kind) and isinstance(kind, type):
        hints = typing.get_type_hints(kind)
        for field in fields(kind):
            yield field.name
            yield from field_names(hints[field.name])
    for part in typing.get_args(kind):
        yield from field_names(part)


@pytest.mark.parametrize("kind", [OpenView, PooledResult, PooledSample, Surroundings])
def test_no_type_of_the_open_side_has_a_place_for_an_arm(kind: type) -> None:
    names = list(field_names(kind))
    assert names
    assert [name for name in names if set(name.split("_")) & set(ARM_WORDS)] == []


def test_the_walk_over_types_would_find_an_arm() -> None:
    assert "arm" in list(field_names(CurveLine))


def assigned_anew(people: Patients, seed: int) -> Patients:
    return replace(people, experimental=np.random.default_rng(seed).permutation(people.experimental))


def books(
    folder: Path, people: Patients, name: str, changes: Sequence[tuple[str, str]] = ()
) -> tuple[list[LookBook], list[LookBook]]:
    """The open and the closed book of each of two looks, one of them frozen."""
    with desk(held(folder, 2, people=people, name=name, changes=changes), 2) as open_desk:
        return (
            [open_book(open_desk, look) for look in (1, 2)],
            [closed_book(open_desk, look, session=None) for look in (1, 2)],
        )


@pytest.mark.parametrize("changes", [(), (FURTHER,)], ids=["one endpoint", "further endpoints"])
def test_open_pages_are_the_same_whoever_got_which_arm(
    tmp_path: Path, changes: Sequence[tuple[str, str]]
) -> None:
    """The arms exchanged, and the arms dealt anew; the pages that may compare do differ."""
    people = patients()
    open_books, closed_books = books(tmp_path, people, "k4.trial", changes)
    for index, other in enumerate([people.with_arms_exchanged(), assigned_anew(people, 1)]):
        open_others, closed_others = books(tmp_path, other, f"k4-{index}.trial", changes)
        assert repr(open_others) == repr(open_books)
        assert repr(closed_others) != repr(closed_books)


def test_a_pooled_count_that_changes_changes_the_open_pages(tmp_path: Path) -> None:
    people = patients()
    time = people.time.copy()
    time[np.argmax(people.time)] = 10.0  # one more early event
    before, _ = books(tmp_path, people, "k4.trial")
    after, _ = books(tmp_path, replace(people, time=time), "other.trial")
    assert repr(before) != repr(after)


@pytest.fixture(scope="module")
def pooled(tmp_path_factory: pytest.TempPathFactory) -> LookBook:
    with desk(held(tmp_path_factory.mktemp("open"), 4)) as open_desk:
        return open_book(open_desk, 4)


def test_open_pages_name_no_arm_no_letter_and_no_crossing(pooled: LookBook) -> None:
    """At a look after the boundary was crossed."""
    shown = repr(pooled)
    for word in (
        "elletol",
        "yrupine",
        "ELLETOL",
        "YRUPINE",
        "arm\u00a0",
        "Arm\u00a0",
        "crossed'",
        "hazard",
        "masked",
    ):
        assert word not in shown
    assert {look.crossed for look in pooled.frame.spine.looks} == {"none"}
    assert [line.arm for line in parts(pooled, CurveLine)] == [None]


def test_open_pages_carry_no_head_no_digest_and_no_history(pooled: LookBook) -> None:
    assert [sheet.key for sheet in pooled.sheets] == ["glance", "data", "information", "curves"]
    assert pooled.frame.disclosure == "pooled"
    shown = repr(pooled)
    assert "SHA-256" not in shown
    assert "Head" not in shown
    assert "Entr" not in shown


def test_open_pages_say_how_far_the_trial_has_come(pooled: LookBook) -> None:
    glance = pooled.sheet("glance")
    assert glance is not None
    assert text(glance.answer[0]) == "The trial has 107 of 80 planned events, both arms together."


def test_open_and_closed_counts_agree(tmp_path: Path) -> None:
    """Read apart, without and with the arm column, to the same pooled numbers."""
    with desk(held(tmp_path, 2)) as open_desk:
        spines = [open_book(open_desk, 2).frame.spine, closed_book(open_desk, 2, session=None).frame.spine]
        information = [
            text(book.sheets[2].answer[0])
            for book in (open_book(open_desk, 2), closed_book(open_desk, 2, session=None))
        ]
    assert spines[0] == spines[1]
    assert information[0] == information[1]
