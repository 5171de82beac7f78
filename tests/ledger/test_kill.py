"""Killed before any statement of any act, the file opens, verifies, and holds the act or nothing of it."""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path

import pytest

from app.ledger import schema
from app.ledger.trial import Trial
from app.settings import Settings
from tests.ledger import acts, killed, killed_at_random

ROOT = Path(__file__).resolve().parents[2]


@pytest.fixture(scope="module")
def deaths(tmp_path_factory: pytest.TempPathFactory) -> list[dict[str, object]]:
    return told_by(killed.__file__, str(tmp_path_factory.mktemp("killed")))


def told_by(script: str, *words: str) -> list[dict[str, object]]:
    """What a process says, a JSON object a line; it has a single thread, since it forks."""
    environment = {"PYTHONPATH": str(ROOT), "OPENBLAS_NUM_THREADS": "1"}
    command = [sys.executable, script, *words]
    done = subprocess.run(command, capture_output=True, text=True, check=True, env=environment, timeout=300)
    return [json.loads(line) for line in done.stdout.splitlines()]


@pytest.mark.slow
@pytest.mark.parametrize("name", killed.DEEDS)
def test_an_act_is_there_wholly_or_not_at_all(
    deaths: list[dict[str, object]], name: str, settings: Settings
) -> None:
    of_this_act = [death for death in deaths if death["act"] == name]
    assert len(of_this_act) > 5  # BEGIN, reads, inserts, COMMIT
    for death in of_this_act:
        with Trial.open(Path(str(death["file"])), settings) as trial:
            assert not trial.read_only
            assert trial.check_chain() == ()
            n_added = len(trial.entries()) - int(str(death["entries_before"]))
            assert n_added == (1 if death["done"] else 0)  # a kill before COMMIT leaves nothing


@pytest.mark.slow
def test_a_new_trial_file_is_there_whole_or_not_at_all(
    deaths: list[dict[str, object]], settings: Settings
) -> None:
    of_this_act = [death for death in deaths if death["act"] == "create"]
    assert len(of_this_act) > 20
    there = [Path(str(death["file"])) for death in of_this_act if Path(str(death["file"])).exists()]
    assert 1 < len(there) < len(of_this_act)
    for path in there:
        with Trial.open(path, settings) as trial:
            assert trial.check_chain() == ()
            assert len(trial.entries()) == 1


@pytest.mark.slow
def test_a_backup_is_there_whole_or_not_at_all_and_is_recorded_only_when_it_is(
    deaths: list[dict[str, object]], settings: Settings
) -> None:
    of_this_act = [death for death in deaths if death["act"] == "back up"]
    assert len(of_this_act) > 40  # statements of three connections, names taken and given back
    for death in of_this_act:
        path = Path(str(death["file"]))
        backup = path.with_suffix(".backup")
        with Trial.open(path, settings) as trial:
            assert trial.check_chain() == ()
            n_added = len(trial.entries()) - int(str(death["entries_before"]))
            assert n_added == (1 if death["done"] else 0)
            before = trial.entries()[: int(str(death["entries_before"]))]
        assert backup.exists() or not n_added
        if backup.exists():
            with Trial.open(backup, settings) as copied:
                assert copied.check_chain() == ()
                assert copied.entries() == before


@pytest.mark.slow
def test_a_migration_is_done_or_is_done_at_the_next_opening(
    deaths: list[dict[str, object]], settings: Settings
) -> None:
    of_this_act = [death for death in deaths if death["act"] == "migrate"]
    assert len(of_this_act) > 10
    for death in of_this_act:
        with Trial.open(Path(str(death["file"])), settings) as trial:
            assert schema.version(trial._database) == len(schema.MIGRATIONS)
            assert trial.check_chain() == ()
            assert len(trial.entries()) == death["entries_before"]


@pytest.mark.slow
def test_after_a_kill_the_act_can_be_done_again(deaths: list[dict[str, object]], settings: Settings) -> None:
    for death in deaths:
        if death["act"] == "receive the first" and not death["done"]:
            with Trial.open(Path(str(death["file"])), settings) as trial:
                acts.live(trial, until="unmask")
                assert trial.check_chain() == ()


@pytest.mark.slow
@pytest.mark.parametrize("seed", range(4))
def test_of_fifty_random_kills_none_takes_an_acknowledged_act(tmp_path: Path, seed: int) -> None:
    lives = told_by(killed_at_random.__file__, str(tmp_path / "q17.trial"), "50", str(seed))
    assert len(lives) == 50
    before = list(lives[0]["there"])[:1]  # the plan being locked
    n_said = 0
    for life in lives:
        said, there = list(life["said"]), list(life["there"])
        assert life["problems"] == []
        assert there[: len(before) + len(said)] == [*before, *said]  # every act told as done, in its order
        assert len(there) <= len(before) + len(said) + 1  # and at most the one whose word was cut short
        before, n_said = there, n_said + len(said)
    assert n_said > 50
