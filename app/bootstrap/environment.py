"""The private environment: found or made once, then entered.

`python3 app` and `python3 tests` need nothing but Python and pip. The first start makes a virtual environment
beside the program, or in the user's cache folder where the checkout cannot be written, and fills it from the
hashed lock; every later start finds it by name and goes on inside it, without the network.
"""

from __future__ import annotations

import hashlib
import os
import shutil
import sys
import tempfile
import time
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from importlib.util import find_spec
from pathlib import Path
from typing import IO, NoReturn

from app.bootstrap.installation import install
from app.errors import SetupError

if sys.platform == "win32":
    import msvcrt
else:
    import fcntl

ROOT = Path(__file__).resolve().parents[2]
RUNTIME = ("fastapi", "uvicorn", "jinja2", "numpy", "scipy", "pandas", "python_multipart")
"""The modules that show that app/requirements.lock, or something like it, is installed."""

WAIT_SECONDS = 0.2


@dataclass(frozen=True)
class Program:
    """A folder that `python3 FOLDER` runs, and the modules that its lock brings."""

    folder: str
    needs: tuple[str, ...]
    lock_name: str = "requirements.lock"

    @property
    def lock(self) -> Path:
        """Every package with its version and hashes."""
        return Path(self.folder) / self.lock_name


def enter(program: Program, arguments: Sequence[str]) -> None:
    """Return where the packages can be imported; elsewhere start again in the private environment."""
    try:
        if sys.prefix != sys.base_prefix:
            require_packages(program)
        else:
            start_again(private_environment(program), program, arguments)
    except SetupError as error:
        say(str(error))
        sys.exit(error.exit_code)
    except KeyboardInterrupt:
        say("Stopped during set-up; the next start begins it again.")
        sys.exit(SetupError.exit_code)


def require_packages(program: Program) -> None:
    """Refuse a virtual environment that lacks a module of `program`."""
    missing = [name for name in program.needs if find_spec(name) is None]
    if not missing:
        return
    remedy = (
        f"Delete {sys.prefix} and start again"
        if is_ready(Path(sys.prefix))
        else f"Run 'python -m pip install -r {program.lock}' in it, or leave it by 'deactivate'"
    )
    raise SetupError(
        "packages are missing",
        where=f"the virtual environment {sys.prefix}",
        found=f"no {', '.join(missing)}",
        accepted="an environment that holds them, or none",
        remedy=remedy,
    )


def private_environment(program: Program) -> Path:
    """The folder of the environment of `program` for this Python, made now if this is the first start."""
    name = environment_name(program.lock.read_bytes())
    homes = [ROOT / ".environment", *cache_homes()]
    for home in homes:
        if is_ready(home / name):
            return home / name
    home = first_writable(homes)
    with alone(home / f"{name}.gate"):
        if not is_ready(home / name):
            make(home / name, program.lock)
    return home / name


def environment_name(lock: bytes) -> str:
    """One environment for each lock and each Python: another version, build or place makes its own."""
    made_by = f"{sys.version}\n{sys.base_prefix}\n".encode()
    return f"{sys.implementation.cache_tag}-{hashlib.sha256(made_by + lock).hexdigest()[:16]}"


def cache_homes() -> list[Path]:
    """The user's cache folder, for a checkout that cannot be written; none where the user has no home."""
    try:
        places = {
            "win32": os.environ.get("LOCALAPPDATA") or Path.home() / "AppData" / "Local",
            "darwin": Path.home() / "Library" / "Caches",
        }
        place = places.get(sys.platform) or os.environ.get("XDG_CACHE_HOME") or Path.home() / ".cache"
    except RuntimeError:
        return []
    return [Path(place) / "lookledger"]


def first_writable(homes: Sequence[Path]) -> Path:
    """The first of `homes` that takes a file; one is tried, as permission bits alone would not tell."""
    refusals = []
    for home in homes:
        try:
            home.mkdir(parents=True, exist_ok=True)
            with tempfile.TemporaryFile(dir=home):
                return home
        except OSError as refusal:
            refusals.append(f"{home} ({refusal.strerror})")
    raise SetupError(
        "no folder for the private environment can be written",
        found=", ".join(refusals),
        accepted="one folder that can be written",
        remedy="Make one of them writable, or set XDG_CACHE_HOME to another",
    )


def is_ready(folder: Path) -> bool:
    """Whether the environment was filled to the end and the Python behind it is still there."""
    return (folder / "ready").exists() and python_of(folder).exists()


def python_of(folder: Path) -> Path:
    """The interpreter of an environment."""
    return folder / ("Scripts/python.exe" if sys.platform == "win32" else "bin/python")


@contextmanager
def alone(gate: Path) -> Iterator[None]:
    """Hold the gate file: of two first starts at once the second waits, then finds the work done."""
    with gate.open("a+b") as file:
        if not grab(file):
            say("Another start is setting up the same environment; waiting for it.")
            while not grab(file):
                time.sleep(WAIT_SECONDS)
        yield


def grab(file: IO[bytes]) -> bool:
    """Try to lock an open file; closing it, or the end of the process however it comes, unlocks it."""
    try:
        if sys.platform == "win32":
            msvcrt.locking(file.fileno(), msvcrt.LK_NBLCK, 1)
        else:
            fcntl.flock(file, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except (BlockingIOError, PermissionError):
        return False
    return True


def make(folder: Path, lock: Path) -> None:
    """Make and fill the environment; `ready` comes last, so that a half-made one is never entered."""
    started = time.monotonic()
    say(f"First start: installing the packages into {folder}, once; this takes about half a minute.")
    try:
        if folder.exists():
            shutil.rmtree(folder)
        install(folder, python_of(folder), lock, say)
        (folder / "ready").touch()
    except BaseException as failure:
        shutil.rmtree(folder, ignore_errors=True)
        if isinstance(failure, OSError):
            raise cannot_write(folder, failure) from failure
        raise
    say(f"Ready after {time.monotonic() - started:.0f} s.")


def cannot_write(folder: Path, failure: OSError) -> SetupError:
    """The sentence for a disk that is full, or a folder that stopped being writable, half-way."""
    return SetupError(
        "the private environment could not be written",
        where=str(folder.parent),
        found=failure.strerror or str(failure),
        remedy="Make room or make the folder writable, and run the same command again",
    )


def start_again(folder: Path, program: Program, arguments: Sequence[str]) -> NoReturn:
    """Go on in the environment at `folder`, where nobody's PYTHONPATH may shadow a pinned package."""
    command = [str(python_of(folder)), program.folder, *arguments]
    surroundings = {
        key: value for key, value in os.environ.items() if key not in ("PYTHONPATH", "PYTHONHOME")
    }
    sys.stderr.flush()
    if sys.platform == "win32":  # there, exec returns to the shell before the program has ended
        sys.exit(os.spawnve(os.P_WAIT, command[0], command, surroundings))
    os.execve(command[0], command, surroundings)


def say(line: str) -> None:
    """Progress and failures go to standard error; standard output belongs to the command."""
    print(line, file=sys.stderr, flush=True)
