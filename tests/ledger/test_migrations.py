"""Every schema that was ever released still opens, migrates, verifies and folds."""

from __future__ import annotations

import sqlite3
from collections.abc import Callable
from pathlib import Path

import pytest

from app.ledger import schema
from app.ledger.database import Database
from app.ledger.trial import Trial
from app.settings import Settings
from tests.ledger import acts

SCHEMAS = Path(__file__).parent / "schemas"
HEADS = {
    1: "f3100f3ae37e4f0912deed5c7cdccd080ae3689748cf4192e2e1e32cc8721a64",
    2: "472743e993df660647d6c8b45fa7fc36dae12f6742221530d7981afd40b00a26",
}


class Interrupted(Exception):
    """What comes between."""


def released(version: int, path: Path) -> None:
    """A trial file of an older schema, made from the SQL text that was kept of it."""
    shell = sqlite3.connect(path)
    shell.executescript((SCHEMAS / f"schema_{version}.sql").read_text(encoding="utf-8"))
    shell.close()


def test_a_file_of_every_schema_is_kept() -> None:
    kept = sorted(path.name for path in SCHEMAS.glob("schema_*.sql"))
    assert kept == [f"schema_{number}.sql" for number in range(1, len(schema.MIGRATIONS) + 1)]
    assert list(HEADS) == list(range(1, len(schema.MIGRATIONS) + 1))


@pytest.mark.parametrize("version", range(1, len(schema.MIGRATIONS) + 1))
def test_a_file_of_an_older_schema_opens_and_goes_on(path: Path, settings: Settings, version: int) -> None:
    released(version, path)
    with Trial.open(path, settings) as trial:
        assert not trial.read_only
        assert trial.check_chain() == ()
        assert schema.version(trial._database) == len(schema.MIGRATIONS)
        assert [look.number for look in trial.state().frozen_looks] == [1, 2]
        acts.live_on(trial)
        with trial.act() as act:
            acts.receive(act, 3)
        assert trial.check_chain() == ()


@pytest.mark.parametrize("version", range(1, len(schema.MIGRATIONS) + 1))
def test_a_file_of_an_older_schema_is_read_without_being_changed(
    path: Path, settings: Settings, version: int
) -> None:
    released(version, path)
    before = path.read_bytes()
    with Trial.open(path, settings, read_only=True) as trial:
        assert trial.check_chain() == ()
        assert schema.version(trial._database) == version
    assert path.read_bytes() == before


def test_entries_written_under_an_older_schema_stay_as_they_are(path: Path, settings: Settings) -> None:
    released(1, path)
    with Trial.open(path, settings, read_only=True) as trial:
        before = trial.entries()
    with Trial.open(path, settings) as trial:
        assert schema.version(trial._database) == len(schema.MIGRATIONS)
        assert trial.entries() == before


@pytest.mark.parametrize("version", HEADS)
def test_the_head_of_each_released_history_is_what_it_was(
    path: Path, settings: Settings, version: int
) -> None:
    released(version, path)
    with Trial.open(path, settings, read_only=True) as trial:
        assert trial.head() == HEADS[version]


@pytest.mark.parametrize("n_done", range(len(schema.MIGRATIONS)))
def test_a_migration_that_breaks_off_leaves_nothing(
    path: Path, monkeypatch: pytest.MonkeyPatch, n_done: int
) -> None:
    path.touch()
    database = Database(path, read_only=False, wait_seconds=1)
    whole = schema.MIGRATIONS
    monkeypatch.setattr(schema, "MIGRATIONS", whole[:n_done])
    schema.migrate(database, "2026-01-15T09:00:00Z")
    tables = database.run("SELECT * FROM sqlite_master")
    monkeypatch.setattr(schema, "MIGRATIONS", (*whole[:n_done], broken_off(whole[n_done])))
    with pytest.raises(Interrupted):
        schema.migrate(database, "2026-01-15T09:00:00Z")
    assert schema.version(database) == n_done
    assert database.run("SELECT * FROM sqlite_master") == tables
    database.close()


def broken_off(migration: Callable[[schema.Run], None]) -> Callable[[schema.Run], None]:
    def run_and_break_off(run: schema.Run) -> None:
        migration(run)
        raise Interrupted

    return run_and_break_off


def test_a_later_migration_runs_once_and_leaves_its_record(
    lived: Trial, settings: Settings, monkeypatch: pytest.MonkeyPatch
) -> None:
    def add_a_table_of_notes(run: schema.Run) -> None:
        run("CREATE TABLE note (text TEXT)")

    monkeypatch.setattr(schema, "MIGRATIONS", (*schema.MIGRATIONS, add_a_table_of_notes))
    for _ in range(2):
        with Trial.open(lived.path, settings) as trial:
            assert trial.check_chain() == ()
            ran = trial._database.run("SELECT number, name FROM migration ORDER BY number")
    assert ran == [
        (1, "lay_out_entries_contents_and_secrets"),
        (2, "admit_amendments_refusals_recommendations_errata_and_backups"),
        (3, "add_a_table_of_notes"),
    ]


def test_a_file_open_for_reading_is_not_migrated(
    lived: Trial, settings: Settings, monkeypatch: pytest.MonkeyPatch
) -> None:
    before = lived.path.read_bytes()
    monkeypatch.setattr(
        schema, "MIGRATIONS", (*schema.MIGRATIONS, lambda run: run("CREATE TABLE note (text)"))
    )
    with Trial.open(lived.path, settings, read_only=True) as trial:
        assert trial.check_chain() == ()
    assert lived.path.read_bytes() == before
