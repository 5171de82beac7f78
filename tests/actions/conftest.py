"""The invented trial, made once; each test acts on its own copy."""

from __future__ import annotations

import random
import shutil
from collections.abc import Iterator
from datetime import UTC, datetime
from pathlib import Path

import pytest

from app.actions.demo import make_demo
from app.actions.desk import Desk
from app.settings import Settings

TODAY = datetime(2026, 11, 2, 9, 30, tzinfo=UTC)


@pytest.fixture
def settings() -> Settings:
    return Settings(clock=lambda: TODAY, random_bytes=random.Random(17).randbytes)


@pytest.fixture(scope="session")
def demo_trial(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Three looks received, two of them frozen."""
    path = tmp_path_factory.mktemp("demo") / "Q17.trial"
    make_demo(Settings(clock=lambda: TODAY, random_bytes=random.Random(17).randbytes), path)
    return path


@pytest.fixture
def path(demo_trial: Path, tmp_path: Path) -> Path:
    return Path(shutil.copy(demo_trial, tmp_path / "Q17.trial"))


@pytest.fixture
def desk(path: Path, settings: Settings) -> Iterator[Desk]:
    with Desk.open(settings, path) as desk:
        yield desk
