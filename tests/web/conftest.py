"""The invented trial, made once; each test serves its own copy."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import pytest

from app.actions.demo import make_demo
from app.settings import Settings
from tests.web.served import TODAY, Served, serve_copy


@pytest.fixture(scope="session")
def demo_trial(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("demo") / "demo.trial"
    make_demo(replace(Settings(), clock=lambda: TODAY), path)
    return path


@pytest.fixture
def served(demo_trial: Path, tmp_path: Path) -> Iterator[Served]:
    running = serve_copy(demo_trial, tmp_path)
    with running.client, running.desk:
        yield running
