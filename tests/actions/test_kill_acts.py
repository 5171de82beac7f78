"""Killed at any statement or rename of a person's act, the file holds all of the act or nothing of it."""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path

import pytest

from app.actions.check import verify
from app.actions.desk import Desk
from app.actions.report import report
from app.settings import Settings
from tests.actions import killed_acts

ROOT = Path(__file__).resolve().parents[2]
N_ENTRIES = {"freeze and receive": 2, "freeze and receive after a held look": 2}


@pytest.fixture(scope="module")
def deaths(tmp_path_factory: pytest.TempPathFactory) -> list[dict[str, object]]:
    environment = {"PYTHONPATH": str(ROOT), "OPENBLAS_NUM_THREADS": "1"}  # one thread: the process forks
    command = [sys.executable, killed_acts.__file__, str(tmp_path_factory.mktemp("killed"))]
    done = subprocess.run(command, capture_output=True, text=True, check=True, env=environment, timeout=300)
    return [json.loads(line) for line in done.stdout.splitlines()]


@pytest.mark.slow
@pytest.mark.parametrize("name", [*killed_acts.DEEDS, *killed_acts.AFTER_A_HELD_LOOK])
def test_the_act_is_there_wholly_or_not_at_all(
    deaths: list[dict[str, object]], settings: Settings, name: str
) -> None:
    of_this_act = [death for death in deaths if death["act"] == name]
    assert len(of_this_act) > 5
    assert [death["done"] for death in of_this_act] == [False] * (len(of_this_act) - 1) + [True]
    for death in of_this_act:
        path = Path(str(death["folder"])) / "Q17.trial"
        with Desk.open(settings, path) as desk:
            assert desk.may_write
            assert desk.trial.check_chain() == ()
            n_added = len(desk.trial.entries()) - int(str(death["entries_before"]))
        assert n_added == (N_ENTRIES.get(name, 1) if death["done"] else 0)
    assert verify(settings, path).ok  # every number too, where the act was done


@pytest.mark.slow
def test_every_file_of_a_report_is_whole_under_its_name(
    deaths: list[dict[str, object]], settings: Settings
) -> None:
    seen = set()
    for death in deaths:
        folder = Path(str(death["folder"]))
        if death["act"] == "write report":
            with Desk.open(settings, folder / "Q17.trial") as desk:
                wanted = report(desk, 2).by_name
            found = {path.name: path.read_bytes() for path in folder.glob("report/[!.]*")}
            assert found.items() <= wanted.items()
            assert found == wanted or not death["done"]
            seen.add(len(found))
    assert seen == set(range(len(wanted) + 1))  # killed between all of them
