"""A process whose children carry out an act each and kill themselves before its statement n, for every n.

Run as `python killed.py FOLDER`. Writes FOLDER/<act>/<n>.trial, and prints a JSON line for each: the act, the
file, whether the child lived to say that the act was done, and how many entries the file had before. Making a
file, backing it up and migrating it count every statement of every connection, and every change of a name.
"""

from __future__ import annotations

import json
import os
import shutil
import signal
import sqlite3
import sys
from collections.abc import Callable, Iterator
from itertools import count
from pathlib import Path
from typing import Any

from app.ledger.trial import Trial
from tests.ledger import acts

DEEDS = {**acts.LIFE, **acts.LATER}
SCHEMAS = Path(__file__).parent / "schemas"


def die() -> None:
    os.kill(os.getpid(), signal.SIGKILL)


def dying_at(n: int) -> Callable[..., None]:
    """A trace that lets n - 1 calls pass and kills at the next."""
    calls = count(1)

    def trace(*_: object) -> None:
        if next(calls) == n:
            die()

    return trace


def lives(do: Callable[[], None]) -> bool:
    """Carry it out in a child; False when the child was killed."""
    child = os.fork()
    if child == 0:
        do()
        os._exit(0)
    _, status = os.waitpid(child, 0)
    if not os.WIFSIGNALED(status) and os.waitstatus_to_exitcode(status):
        raise SystemExit(f"a child ended by itself with status {status}")
    return not os.WIFSIGNALED(status)


def carry_out(name: str, path: Path, n: int) -> None:
    with Trial.open(path, acts.ticking_settings()) as trial:
        trial._database._connection.set_trace_callback(dying_at(n))
        with trial.act() as act:
            DEEDS[name](trial, act)
        trial._database._connection.set_trace_callback(None)


def create(path: Path, n: int) -> None:
    die_at_any(n)
    acts.start(path, acts.ticking_settings()).close()


def back_up(path: Path, n: int) -> None:
    with Trial.open(path, acts.ticking_settings()) as trial:
        trace = die_at_any(n)
        trial._database._connection.set_trace_callback(trace)
        trial.back_up(path.with_suffix(".backup"), by="M. Berg")
        trial._database._connection.set_trace_callback(None)


def migrate(path: Path, n: int) -> None:
    die_at_any(n)
    Trial.open(path, acts.ticking_settings()).close()


def die_at_any(n: int) -> Callable[..., None]:
    """From here on every statement of a new connection counts, and every change of a name."""
    trace = dying_at(n)
    connect, link, unlink = sqlite3.connect, os.link, Path.unlink

    def traced_connect(*args: Any, **options: Any) -> sqlite3.Connection:
        connection = connect(*args, **options)
        if options.get("uri"):
            connection.set_trace_callback(trace)
        return connection

    sqlite3.connect = traced_connect
    os.link = lambda *names: (trace(), link(*names), trace())
    Path.unlink = lambda path, missing_ok=False: (trace(), unlink(path, missing_ok=missing_ok))
    return trace


def deaths(name: str, folder: Path, before: Path | None, do: Callable[[Path, int], None]) -> Iterator[Path]:
    """Print what became of each child; the file of the first that lived comes back."""
    folder.mkdir()
    n_entries = len(entries(before)) if before else 0
    for n in count(1):
        path = folder / f"{n}.trial"
        if before:
            shutil.copy(before, path)
        done = lives(lambda path=path, n=n: do(path, n))
        print(json.dumps({"act": name, "file": str(path), "done": done, "entries_before": n_entries}))
        if done:
            yield path
            return


def entries(path: Path) -> tuple[object, ...]:
    with Trial.open(path, acts.ticking_settings(), read_only=True) as trial:
        return trial.entries()


def of_schema_1(folder: Path) -> Path:
    """A trial file as version 1 of the schema kept it."""
    path = folder / "schema_1.trial"
    shell = sqlite3.connect(path)
    shell.executescript((SCHEMAS / "schema_1.sql").read_text(encoding="utf-8"))
    shell.close()
    return path


def main(folder: Path) -> None:
    (whole,) = deaths("create", folder / "create", None, create)
    for number, name in enumerate(DEEDS):
        (whole,) = deaths(
            name, folder / str(number), whole, lambda path, n, name=name: carry_out(name, path, n)
        )
    list(deaths("back up", folder / "backup", whole, back_up))
    list(deaths("migrate", folder / "migrate", of_schema_1(folder), migrate))


if __name__ == "__main__":
    main(Path(sys.argv[1]))
