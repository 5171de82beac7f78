"""Triggers: nobody with an SQL shell changes the history by mistake."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator
from pathlib import Path

import pytest

from app.errors import LedgerError
from app.ledger.trial import Trial

ENTRY = (
    "INSERT {or_what} INTO entry (id, at, kind, body, previous, digest)"
    " VALUES ({id}, 'at', 'kind', '{{}}', {previous}, 'd')"
)
LAST = "(SELECT digest FROM entry ORDER BY id DESC LIMIT 1)"


@pytest.fixture
def shell(lived: Trial) -> Iterator[sqlite3.Connection]:
    """An SQL shell on the file of a trial."""
    connection = sqlite3.connect(lived.path)
    yield connection
    connection.close()


def refused(shell: sqlite3.Connection, statement: str) -> str:
    before = list(shell.iterdump())
    with pytest.raises(sqlite3.IntegrityError) as fault:
        shell.execute(statement)
    shell.rollback()
    assert list(shell.iterdump()) == before
    return str(fault.value)


@pytest.mark.parametrize("table", ["entry", "content", "secret", "migration"])
@pytest.mark.parametrize("or_what", ["", "OR REPLACE", "OR IGNORE"])
def test_no_row_is_changed(shell: sqlite3.Connection, table: str, or_what: str) -> None:
    column = {"entry": "body", "migration": "name"}.get(table, "bytes")
    assert refused(shell, f"UPDATE {or_what} {table} SET {column} = 'x'") == f"{table} is never changed"


@pytest.mark.parametrize("table", ["entry", "content", "secret", "migration"])
@pytest.mark.parametrize("where", ["", "WHERE rowid = 1", "WHERE 1 = 1"])
def test_no_row_is_deleted(shell: sqlite3.Connection, table: str, where: str) -> None:
    if table in ("content", "secret"):
        where = where.replace("rowid = 1", "digest > ''")
    assert refused(shell, f"DELETE FROM {table} {where}") == f"{table} is never deleted from"


@pytest.mark.parametrize("or_what", ["", "OR REPLACE", "OR IGNORE", "OR ROLLBACK"])
def test_no_entry_takes_the_place_of_another(shell: sqlite3.Connection, or_what: str) -> None:
    statement = ENTRY.format(or_what=or_what, id=2, previous="(SELECT previous FROM entry WHERE id = 2)")
    assert refused(shell, statement) == "entry follows the last one"


@pytest.mark.parametrize("table", ["content", "secret"])
@pytest.mark.parametrize("or_what", ["", "OR REPLACE", "OR IGNORE"])
def test_no_stored_bytes_take_the_place_of_others(
    shell: sqlite3.Connection, table: str, or_what: str
) -> None:
    statement = f"INSERT {or_what} INTO {table} SELECT digest, x'00' FROM {table} LIMIT 1"
    assert refused(shell, statement) == f"{table} is never replaced"


@pytest.mark.parametrize("table", ["content", "secret"])
def test_stored_bytes_have_no_row_number_to_replace_them_by(shell: sqlite3.Connection, table: str) -> None:
    with pytest.raises(sqlite3.OperationalError, match="no column named rowid"):
        shell.execute(f"INSERT OR REPLACE INTO {table} (rowid, digest, bytes) VALUES (1, 'd', x'00')")


@pytest.mark.parametrize("number", ["1", "8", "11", "NULL", "-1"])
def test_an_entry_has_the_next_number(shell: sqlite3.Connection, number: str) -> None:
    assert shell.execute("SELECT max(id) FROM entry").fetchone() == (9,)
    statement = ENTRY.format(or_what="", id=number, previous=LAST)
    assert refused(shell, statement) == "entry follows the last one"


@pytest.mark.parametrize("previous", ["'another'", "NULL", "(SELECT digest FROM entry WHERE id = 8)"])
def test_an_entry_names_the_last_one_as_its_predecessor(shell: sqlite3.Connection, previous: str) -> None:
    statement = ENTRY.format(or_what="OR REPLACE", id=10, previous=previous)
    assert refused(shell, statement) == "entry follows the last one"


def test_the_triggers_let_the_next_entry_in(shell: sqlite3.Connection) -> None:
    shell.execute(ENTRY.format(or_what="", id=10, previous=LAST))
    assert shell.execute("SELECT max(id) FROM entry").fetchone() == (10,)


def test_the_program_itself_meets_the_triggers_as_a_sentence(lived: Trial, path: Path) -> None:
    with pytest.raises(LedgerError) as fault:
        lived._database.run("DELETE FROM entry")
    assert str(fault.value) == (
        f"The history is only ever appended to in {path}. Found entry is never deleted from. "
        "Nothing of this act was stored; verify the file."
    )
