"""The invented trial in a trial file: its clock stands at a chosen day, its randomness is seeded."""

from __future__ import annotations

import random
from collections.abc import Sequence
from datetime import UTC, date, datetime, timedelta
from functools import cache
from pathlib import Path
from tempfile import TemporaryDirectory

from app.actions.desk import Desk, UploadedFile
from app.actions.freeze import freeze
from app.actions.receive import Incoming, receive
from app.actions.start import start
from app.model.extract import LookKind
from app.settings import Settings
from tests.unit.review.invented_trial import (
    CUTOFFS,
    FIRST_DAY,
    Patients,
    patients,
    plan_text,
    two_endpoints,
)
from tests.unit.sheets.invented_looks import FURTHER

BY = "M. Berg"


def settings(on: date, seed: int = 17) -> Settings:
    """A clock that stands at nine in the morning of a day, and randomness from a seed."""
    moment = datetime(on.year, on.month, on.day, 9, tzinfo=UTC)
    return Settings(clock=lambda: moment, random_bytes=random.Random(seed).randbytes)


def incoming(
    cutoff: date, people: Patients | None = None, kind: LookKind = "planned", content: bytes | None = None
) -> Incoming:
    content = (people or patients()).at(cutoff).csv() if content is None else content
    return Incoming((UploadedFile(f"adtte-{cutoff}.csv", content),), cutoff, None, kind)


def started(
    path: Path, changes: Sequence[tuple[str, str]] = (), seed: int = 17, name: str = "k4.trial"
) -> Path:
    """A new trial file with the plan locked in it. Its letters follow from the seed: 17 makes control A."""
    file = path / name
    start(settings(FIRST_DAY, seed), plan_name="plan.toml", plan=plan_text(*changes), path=file, by=BY)
    return file


def held(
    path: Path,
    looks: int = 2,
    *,
    frozen: int | None = None,
    changes: Sequence[tuple[str, str]] = (),
    people: Patients | None = None,
    kinds: Sequence[LookKind] = ("planned",) * 4,
    name: str = "k4.trial",
) -> Path:
    """A trial file with so many looks received; all but the last frozen unless `frozen` says how many.

    Files of the patients of every test are made once, and then copied, as people do with trial files.
    """
    frozen = looks - 1 if frozen is None else frozen
    file = path / name
    if people is None:
        file.write_bytes(_made(looks, frozen, tuple(changes), tuple(kinds)))
    else:
        live(started(path, changes, name=name), looks, frozen, kinds, people, further=FURTHER in changes)
    return file


@cache
def _made(
    looks: int, frozen: int, changes: tuple[tuple[str, str], ...], kinds: tuple[LookKind, ...]
) -> bytes:
    with TemporaryDirectory() as folder:
        file = started(Path(folder), changes)
        live(file, looks, frozen, kinds, patients(), further=FURTHER in changes)
        return file.read_bytes()


def live(
    file: Path,
    looks: int,
    frozen: int,
    kinds: Sequence[LookKind],
    people: Patients,
    *,
    further: bool = False,
) -> None:
    """Receive and freeze so many looks; `further` adds the rows of the plan's further endpoints."""
    for number, (cutoff, kind) in enumerate(zip(CUTOFFS[:looks], kinds, strict=False), 1):
        with desk(file, number) as open_desk:
            content = two_endpoints(people, cutoff) if further else None
            given = incoming(cutoff, people, kind, content)
            receive(open_desk, given, acknowledgements={}, by=BY)
            if number <= frozen:
                freeze(open_desk, by=BY)


def desk(file: Path, look: int = 4) -> Desk:
    """The file opened a week after the cutoff of a look."""
    return Desk.open(settings(CUTOFFS[look - 1] + timedelta(days=7)), file)
