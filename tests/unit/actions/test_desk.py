"""The desk: what it keeps between pages, and that each look is read no more often than it must be."""

from __future__ import annotations

from pathlib import Path

import pytest

import app.actions.looks
from app.actions.desk import Cache, Desk
from app.actions.looks import closed_book, open_book, pooled_look
from app.model.look import PooledResult
from app.settings import Settings
from tests.unit.actions.invented_file import desk, held, settings
from tests.unit.review.invented_trial import CUTOFFS


def test_a_value_is_computed_once_and_the_oldest_makes_room() -> None:
    cache, computed = Cache(kept=2), []

    def value(key: str) -> str:
        def compute() -> str:
            computed.append(key)
            return key.upper()

        return cache.get(key, compute)

    assert [value(key) for key in "aabacab"] == list("AABACAB")
    assert computed == ["a", "b", "c", "b"]  # a was used after b, so that c pushed b out


def test_a_value_that_could_not_be_computed_is_asked_for_again() -> None:
    cache = Cache()
    with pytest.raises(ZeroDivisionError):
        cache.get("key", lambda: 1 / 0)
    assert cache.get("key", lambda: 2.0) == 2.0


def test_each_look_is_pooled_once_though_every_later_one_names_it(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Also when fewer looks are kept than there are."""
    file = held(tmp_path, 4)
    pooled: list[int] = []
    pool = app.actions.looks.pool_delivery

    def counted(*given: object, number: int, **further: object) -> PooledResult:
        pooled.append(number)
        return pool(*given, number=number, **further)  # type: ignore[arg-type]

    monkeypatch.setattr("app.actions.looks.pool_delivery", counted)
    with desk(file) as open_desk:
        open_desk.open_looks = Cache(kept=1)
        open_book(open_desk, 4)
        closed_book(open_desk, 4, session=None)
    assert sorted(pooled) == [1, 2, 3, 4]


def test_a_file_that_may_only_be_read_is_shown_and_nothing_is_entered(tmp_path: Path) -> None:
    file = held(tmp_path, 2)
    before = file.read_bytes()
    given: Settings = settings(CUTOFFS[3])
    with desk(file, 2) as writable:
        trial = type(writable.trial).open(file, given, read_only=True)
    with Desk(given, trial) as reading:
        assert not reading.may_write
        assert closed_book(reading, 2, session="an evening").frame.look == 2
    assert file.read_bytes() == before


def test_a_pooled_look_names_the_looks_before_it(tmp_path: Path) -> None:
    with desk(held(tmp_path, 4)) as open_desk:
        past = pooled_look(open_desk, 3).past
    assert past == ((1, 30 / 80, 30), (2, 52 / 80, 52))
