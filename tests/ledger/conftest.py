"""Trial files for the tests of the ledger."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest

from app.ledger.trial import Trial
from app.settings import Settings
from tests.ledger import acts


@pytest.fixture
def settings() -> Settings:
    return acts.ticking_settings()


@pytest.fixture
def path(tmp_path: Path) -> Path:
    return tmp_path / "q17.trial"


@pytest.fixture
def trial(path: Path, settings: Settings) -> Iterator[Trial]:
    """A plan just locked."""
    with acts.start(path, settings) as trial:
        yield trial


@pytest.fixture(scope="session")
def a_life(tmp_path_factory: pytest.TempPathFactory) -> bytes:
    """The bytes of a trial file: two looks received and frozen, unmasked in between."""
    path = tmp_path_factory.mktemp("life") / "q17.trial"
    with acts.start(path, acts.ticking_settings()) as trial:
        acts.live(trial)
    return path.read_bytes()


@pytest.fixture
def lived(a_life: bytes, path: Path, settings: Settings) -> Iterator[Trial]:
    """That trial, opened."""
    path.write_bytes(a_life)
    with Trial.open(path, settings) as trial:
        yield trial


@pytest.fixture
def lived_on(lived: Trial) -> Trial:
    """The same with every kind of act of the present schema; its backup lies beside it."""
    acts.live_on(lived)
    return lived
