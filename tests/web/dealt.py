"""Trials that differ in nothing but who got which arm, served as they would be."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import replace
from pathlib import Path

import numpy as np
from fastapi.testclient import TestClient

from app.web.application import create_app
from tests.unit.actions.invented_file import desk, live, started
from tests.unit.review.invented_trial import Patients, patients
from tests.unit.sheets.invented_looks import FURTHER
from tests.web.served import ADDRESS, KEYS, Served


def dealt(people: Patients, ratio: float, seed: int) -> Patients:
    """The same patients with the arms dealt so that their hazard ratio is `ratio`, experimental to control.

    The next to have an event is one of the experimental arm with probability r E/(r E + C), where E and C are
    still without: the labels of a proportional-hazards trial, given everything but the arms (Cox 1972).
    """
    draw = np.random.default_rng(seed)
    left = {True: people.time.size // 2, False: people.time.size - people.time.size // 2}
    experimental = np.zeros(people.time.size, dtype=bool)
    for subject in np.argsort(people.time, kind="stable"):
        weight = ratio * left[True]
        experimental[subject] = draw.random() * (weight + left[False]) < weight
        left[bool(experimental[subject])] -= 1
    return replace(people, experimental=experimental)


def pooled_patients(size: int = 160) -> Patients:
    """Entry, times and strata of everybody, without a difference between arms."""
    return patients(seed=8, size=size, hazard_ratio=1.0, median=250.0)


@contextmanager
def serving(
    folder: Path,
    people: Patients,
    *,
    looks: int = 3,
    seed: int = 17,
    changes: Sequence[tuple[str, str]] = (),
) -> Iterator[Served]:
    """A trial file with so many looks received and all but the last frozen, behind the real application."""
    folder.mkdir(parents=True, exist_ok=True)
    path = started(folder, changes, seed)
    live(path, looks, looks - 1, ("planned",) * looks, people, further=FURTHER in changes)
    with desk(path, looks) as open_desk:
        app = create_app(open_desk.settings, open_desk, KEYS, port=ADDRESS.port)
        client = TestClient(app, base_url=ADDRESS.url, raise_server_exceptions=False)
        with client:
            yield Served(path, open_desk, app, client)
