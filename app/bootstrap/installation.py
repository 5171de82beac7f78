"""Filling an environment by pip, with progress, and saying in one sentence why it could not be filled."""

from __future__ import annotations

import re
import subprocess
import sys
from collections.abc import Callable
from importlib.util import find_spec
from pathlib import Path
from typing import NamedTuple

from app.errors import SetupError

try:
    import venv
except ImportError:  # some distributions ship it apart
    venv = None  # type: ignore[assignment]

OPTIONS = (
    "install",
    "--no-deps",
    "--only-binary",
    ":all:",
    "--require-hashes",
    "--no-user",
    "--no-input",
    "--disable-pip-version-check",
    "--progress-bar",
    "off",
)

# pip names what it takes from an index, but gives the file name of a wheel that lies on a disk
PACKAGE = r"Collecting ([\w.-]+)==([\w.]+)|Processing (?:.*[/\\])?([\w.]+)-([\w.]+)-[^/\\]+\.whl"

Say = Callable[[str], None]


class Cause(NamedTuple):
    """A way to fail, told by what pip prints."""

    pattern: str
    what: str
    accepted: str
    remedy: str


CAUSES = (
    Cause(
        r"No space left on device|Disk quota exceeded",
        "the disk is full",
        "about 1 GB of room",
        "Make room and run the same command again",
    ),
    Cause(
        r"Read-only file system|Permission denied",
        "the private environment cannot be written",
        "a folder that can be written",
        "Make it writable and run the same command again",
    ),
    Cause(
        r"DO NOT MATCH THE HASHES",
        "a downloaded package is not the one that was pinned",
        "the bytes whose hash the lock lists",
        "Check the package index that pip is set to use; nothing was kept",
    ),
    Cause(
        r"NewConnectionError|Failed to establish a new connection|[Nn]ame resolution|getaddrinfo failed"
        r"|Name or service not known|Connection refused|Network is unreachable|No route to host"
        r"|[Tt]imed? ?out|Proxy ?Error|SSL ?Error|Connection aborted|Connection reset|Connection broken"
        r"|RemoteDisconnected|IncompleteRead|HTTP error 5\d\d",
        "the packages could not be downloaded",
        "an answer from the package index",
        "Connect to the network, which only the first start needs, and run the same command again",
    ),
    Cause(
        r"No matching distribution found for \S+",
        "a package is not offered for this Python and machine",
        "an index that offers it, for a common machine and CPython 3.11, 3.12 or 3.13",
        "Check the network and the index that pip is set to use, or start with another Python",
    ),
)
"""In this order: a full disk or a lost network also hides every package, and pip then says both."""


def install(folder: Path, python: Path, lock: Path, say: Say) -> None:
    """Make the environment `folder` and install into it exactly what `lock` lists."""
    create(folder)
    output = run_pip([*pip_for(python), *OPTIONS, "--requirement", str(lock)], Progress(lock, say))
    if output is not None:
        raise reason(output, folder)


def create(folder: Path) -> None:
    """An empty environment that borrows the running Python."""
    if venv is None:
        raise SetupError(
            "this Python cannot make virtual environments",
            found=f"no module venv in {sys.executable}",
            accepted="a Python with its venv module",
            remedy="Install it (on Debian and Ubuntu: apt install python3-venv)",
        )
    venv.create(folder, with_pip=False, symlinks=sys.platform != "win32")


def pip_for(python: Path) -> list[str]:
    """The command of a pip that installs into the environment of `python`.

    The outer pip saves the two seconds of unpacking one there; -P keeps a pip.py in the current folder out.
    """
    if find_spec("pip") is not None:
        return [sys.executable, "-P", "-m", "pip", "--python", str(python)]
    if find_spec("ensurepip") is not None:
        unpacked = subprocess.run([str(python), "-I", "-m", "ensurepip"], capture_output=True, check=False)
        if unpacked.returncode == 0:
            return [str(python), "-P", "-m", "pip"]
    raise SetupError(
        "this Python has no pip",
        found=f"neither pip nor a working ensurepip in {sys.executable}",
        accepted="a Python with pip",
        remedy="Install it (on Debian and Ubuntu: apt install python3-pip)",
    )


class Progress:
    """Turns pip's own lines into one line per package, with how many are left."""

    def __init__(self, lock: Path, say: Say) -> None:
        self.total = len(re.findall(r"^[\w.-]+==", lock.read_text(encoding="utf-8"), re.MULTILINE))
        self.seen = 0
        self.say = say

    def read(self, line: str) -> None:
        """Say what `line` of pip means, if it means progress."""
        found = re.match(PACKAGE, line)
        if found:
            self.seen += 1
            name, version = filter(None, found.groups())
            self.say(f"  {self.seen} of {self.total}: {name} {version}")
        elif line.startswith("WARNING: Retrying"):
            self.say("  no answer from the package index; trying again")
        elif line.startswith("Installing collected packages"):
            self.say("  unpacking")


def run_pip(command: list[str], progress: Progress) -> str | None:
    """Run pip to its end; its whole output where it failed, else None."""
    lines = []
    with subprocess.Popen(
        command, stdout=subprocess.PIPE, stderr=subprocess.STDOUT, text=True, errors="replace"
    ) as pip:
        for line in pip.stdout or ():
            lines.append(line)
            progress.read(line)
    return "".join(lines) if pip.returncode else None


def reason(output: str, folder: Path) -> SetupError:
    """Why pip failed, from what it printed."""
    for cause in CAUSES:
        matches = re.findall(cause.pattern, output)
        if matches:
            return SetupError(
                cause.what,
                where=f"the set-up of {folder}",
                found=repr(matches[-1]),
                accepted=cause.accepted,
                remedy=cause.remedy,
            )
    return SetupError(
        "the packages could not be installed",
        where=f"the set-up of {folder}",
        found=repr(last_words(output)),
        remedy="Mend what pip names there and run the same command again",
    )


def last_words(output: str) -> str:
    """The line in which pip says what went wrong."""
    lines = [line.strip() for line in output.splitlines() if line.strip()]
    errors = [line for line in lines if line.startswith("ERROR")]
    return (errors or lines or ["nothing"])[-1]
