"""`python3 app` from nothing: made once, found afterwards, and one sentence for each way to fail.

Each test starts the real set-up in a small checkout whose lock lists one small package made here, so that
neither the network nor minutes are needed, under the Python behind the one that runs the tests.
"""

from __future__ import annotations

import ast
import base64
import hashlib
import os
import shutil
import subprocess
import sys
import venv
import zipfile
from collections.abc import Sequence
from pathlib import Path

import pytest

from app.bootstrap import environment, installation, python
from app.bootstrap.environment import ROOT, RUNTIME, alone, environment_name, first_writable
from app.errors import SetupError

OUTER_PYTHON = sys._base_executable
CLOSED_PORT = "http://127.0.0.1:9/simple"

MAIN = """
import os, sys
folder = os.path.dirname(os.path.abspath(__file__))
sys.path[0] = os.path.dirname(folder)
from app.bootstrap.environment import Program, enter
enter(Program(folder, needs=("probe",)), sys.argv[1:])
import probe
print(probe.WORD, sys.argv[1:], sys.prefix)
"""


def wheel(folder: Path) -> Path:
    """A package `probe` of one line, built by hand after the wheel format's specification (PEP 427)."""
    files = {
        "probe.py": "WORD = 'hello'\n",
        "probe-1.0.dist-info/METADATA": "Metadata-Version: 2.1\nName: probe\nVersion: 1.0\n",
        "probe-1.0.dist-info/WHEEL": "Wheel-Version: 1.0\nRoot-Is-Purelib: true\nTag: py3-none-any\n",
    }
    record = "".join(f"{name},sha256={digest(text)},{len(text)}\n" for name, text in files.items())
    path = folder / "probe-1.0-py3-none-any.whl"
    with zipfile.ZipFile(path, "w") as archive:
        for name, text in {**files, "probe-1.0.dist-info/RECORD": record}.items():
            archive.writestr(name, text)
    return path


def digest(text: str) -> str:
    return base64.urlsafe_b64encode(hashlib.sha256(text.encode()).digest()).decode().rstrip("=")


class Checkout:
    """A copy of the set-up with a program `tool` that needs `probe`, and a folder as package index."""

    def __init__(self, folder: Path) -> None:
        self.root = folder / "checkout"
        self.index = folder / "index"
        self.cache = folder / "cache"
        self.index.mkdir()
        shutil.copytree(ROOT / "app" / "bootstrap", self.root / "app" / "bootstrap")
        for name in ("__init__.py", "errors.py"):
            shutil.copy(ROOT / "app" / name, self.root / "app" / name)
        (self.root / "tool").mkdir()
        (self.root / "tool" / "__main__.py").write_text(MAIN)
        self.lock(hashlib.sha256(wheel(self.index).read_bytes()).hexdigest())

    def lock(self, sha256: str, name: str = "probe") -> None:
        lock = self.root / "tool" / "requirements.lock"
        lock.write_text(f"{name}==1.0 \\\n    --hash=sha256:{sha256}\n")

    def command(self) -> list[str]:
        return [OUTER_PYTHON, str(self.root / "tool"), "word"]

    def surroundings(self, **changes: str) -> dict[str, str]:
        """The environment variables of a start that sees no package index but ours."""
        kept = {key: value for key, value in os.environ.items() if not key.startswith(("PIP_", "PYTHON"))}
        own = {
            "PIP_CONFIG_FILE": os.devnull,
            "PIP_NO_INDEX": "1",
            "PIP_FIND_LINKS": str(self.index),
            "PIP_NO_CACHE_DIR": "1",
            "XDG_CACHE_HOME": str(self.cache),
        }
        return {**kept, **own, **changes}

    def start(self, **changes: str) -> subprocess.CompletedProcess[str]:
        surroundings = self.surroundings(**changes)
        return subprocess.run(self.command(), env=surroundings, capture_output=True, text=True, check=False)

    def environments(self) -> list[Path]:
        return [path for path in (self.root / ".environment").glob("*") if path.is_dir()]


@pytest.fixture
def checkout(tmp_path: Path) -> Checkout:
    return Checkout(tmp_path)


def assert_one_sentence(started: subprocess.CompletedProcess[str], *parts: str) -> None:
    """The start ended with exit code 5 and a last line that holds `parts`, and without a traceback."""
    assert started.returncode == 5
    assert started.stdout == ""
    assert "Traceback" not in started.stderr
    last = started.stderr.splitlines()[-1]
    assert [part for part in parts if part not in last] == []


def test_the_first_start_makes_the_environment_and_the_second_finds_it(checkout: Checkout) -> None:
    first = checkout.start()
    assert first.stdout.startswith("hello ['word'] ")
    assert "First start" in first.stderr
    assert "1 of 1: probe 1.0" in first.stderr
    second = checkout.start(PIP_FIND_LINKS="gone")
    assert second.stdout == first.stdout
    assert second.stderr == ""


def test_the_program_runs_inside_the_checkout_s_own_environment(checkout: Checkout) -> None:
    started = checkout.start()
    assert [str(path) for path in checkout.environments()] == [started.stdout.split()[-1]]


def test_of_two_first_starts_at_once_one_makes_and_both_run(checkout: Checkout) -> None:
    surroundings = checkout.surroundings()
    both = [
        subprocess.Popen(checkout.command(), env=surroundings, stdout=-1, stderr=-1, text=True) for _ in "12"
    ]
    outputs = [start.communicate() for start in both]
    assert [output.split()[0] for output, _ in outputs] == ["hello", "hello"]
    assert sorted("First start" in progress for _, progress in outputs) == [False, True]


def test_an_environment_that_was_not_finished_is_made_anew(checkout: Checkout) -> None:
    checkout.start()
    (made,) = checkout.environments()
    (made / "ready").unlink()
    again = checkout.start()
    assert "First start" in again.stderr
    assert again.stdout.startswith("hello")


def test_another_lock_makes_another_environment(checkout: Checkout) -> None:
    checkout.start()
    lock = checkout.root / "tool" / "requirements.lock"
    lock.write_text(f"# changed\n{lock.read_text()}")
    assert "First start" in checkout.start().stderr
    assert len(checkout.environments()) == 2


def test_another_python_makes_another_environment(monkeypatch: pytest.MonkeyPatch) -> None:
    ours = environment_name(b"lock")
    monkeypatch.setattr(sys, "version", f"{sys.version} rebuilt")
    assert environment_name(b"lock") != ours


def test_a_python_path_of_the_user_does_not_shadow_a_pinned_package(
    checkout: Checkout, tmp_path: Path
) -> None:
    (tmp_path / "probe.py").write_text("WORD = 'shadow'\n")
    assert checkout.start(PYTHONPATH=str(tmp_path)).stdout.startswith("hello")


def test_where_the_checkout_cannot_be_written_the_cache_folder_is_used(checkout: Checkout) -> None:
    (checkout.root / ".environment").write_text("a file where the folder would be")
    started = checkout.start()
    assert started.stdout.split()[-1].startswith(str(checkout.cache / "lookledger"))


def test_without_any_folder_to_write_one_sentence_names_both(checkout: Checkout) -> None:
    (checkout.root / ".environment").write_text("a file where the folder would be")
    checkout.cache.write_text("another")
    started = checkout.start()
    assert_one_sentence(
        started,
        "No folder for the private environment can be written",
        str(checkout.root / ".environment"),
        str(checkout.cache / "lookledger"),
    )


def test_without_network_one_sentence_says_that_only_the_first_start_needs_it(checkout: Checkout) -> None:
    started = checkout.start(PIP_NO_INDEX="0", PIP_FIND_LINKS="", PIP_INDEX_URL=CLOSED_PORT, PIP_RETRIES="1")
    assert_one_sentence(
        started,
        "The packages could not be downloaded",
        "Found 'Connection refused'",
        "Connect to the network, which only the first start needs",
    )
    assert checkout.environments() == []


def test_a_package_with_other_bytes_is_refused_and_nothing_stays(checkout: Checkout) -> None:
    checkout.lock("0" * 64)
    assert_one_sentence(checkout.start(), "A downloaded package is not the one that was pinned")
    assert checkout.environments() == []


def test_a_package_that_no_index_offers_is_named(checkout: Checkout) -> None:
    checkout.lock("0" * 64, name="absent")
    assert_one_sentence(
        checkout.start(),
        "A package is not offered for this Python and machine",
        "No matching distribution found for absent==1.0",
    )


# What pip 23.2 printed on a small tmpfs, on a read-only one, and for a lock that is no lock.
FAILED = "ERROR: Could not install packages due to an OSError: "
PRINTED = {
    "the disk is full": f"{FAILED}[Errno 28] No space left on device\n",
    "the private environment cannot be written": f"{FAILED}[Errno 30] Read-only file system: '/x/lib'\n",
    "the packages could not be installed": "ERROR: Invalid requirement: '<<<<' (from line 1 of x)\n",
}


@pytest.mark.parametrize("what", PRINTED)
def test_what_pip_prints_becomes_one_sentence(what: str) -> None:
    told = installation.reason(PRINTED[what], Path("/x"))
    assert told.what == what
    assert str(told).count("\n") == 0


def test_an_unknown_failure_shows_the_line_in_which_pip_says_it() -> None:
    told = str(installation.reason("Collecting probe\nERROR: the moon is full\n", Path("/x")))
    assert "Found 'ERROR: the moon is full'" in told


def test_a_disk_that_fills_up_outside_pip_is_told_too() -> None:
    told = str(environment.cannot_write(Path("/x/y"), OSError(28, "No space left on device")))
    assert told.startswith(
        "The private environment could not be written in /x. Found No space left on device."
    )


def test_a_python_without_pip_is_told_how_to_get_it(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(installation, "find_spec", lambda name: None)
    with pytest.raises(SetupError, match=r"This Python has no pip\. Found .*apt install python3-pip"):
        installation.pip_for(Path("python"))


@pytest.mark.slow
def test_a_python_without_pip_unpacks_the_one_it_ships(checkout: Checkout) -> None:
    command = [OUTER_PYTHON, "-S", *checkout.command()[1:]]
    started = subprocess.run(
        command, env=checkout.surroundings(), capture_output=True, text=True, check=False
    )
    assert started.stdout.startswith("hello")


def test_a_python_without_venv_is_told_how_to_get_it(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    monkeypatch.setattr(installation, "venv", None)
    with pytest.raises(
        SetupError, match=r"cannot make virtual environments\. Found .*apt install python3-venv"
    ):
        installation.create(tmp_path / "environment")


def test_an_older_python_is_told_so_in_one_sentence(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setattr(sys, "version_info", (3, 10, 13))
    monkeypatch.setattr(sys, "version", "3.10.13 (main)")
    with pytest.raises(SystemExit) as ended:
        python.require_supported_python()
    assert ended.value.code == 5
    assert capsys.readouterr().err.startswith("This Python is too old. Found Python 3.10.13 at ")


@pytest.mark.parametrize(
    "name", ["__init__.py", "__main__.py", "bootstrap/__init__.py", "bootstrap/python.py"]
)
def test_what_an_older_python_reads_first_is_written_for_it(name: str) -> None:
    ast.parse((ROOT / "app" / name).read_text(encoding="utf-8"), feature_version=(3, 6))


def test_what_an_older_python_reads_first_of_the_tests_is_written_for_it() -> None:
    ast.parse((ROOT / "tests" / "__main__.py").read_text(encoding="utf-8"), feature_version=(3, 6))


def bare_environment(folder: Path) -> Path:
    venv.create(folder, with_pip=False, symlinks=True)
    return folder / "bin" / "python"


@pytest.mark.parametrize("program", ["app", "tests"])
def test_a_virtual_environment_that_lacks_packages_is_told_which(program: str, tmp_path: Path) -> None:
    bare = bare_environment(tmp_path / "bare")
    started = subprocess.run([str(bare), str(ROOT / program)], capture_output=True, text=True, check=False)
    assert_one_sentence(
        started,
        f"Packages are missing in the virtual environment {tmp_path / 'bare'}",
        *RUNTIME,
        "requirements.lock",
    )


def test_a_virtual_environment_that_holds_the_packages_just_runs(tmp_path: Path) -> None:
    started = subprocess.run(
        [sys.executable, str(ROOT / "app"), "--help"],
        cwd=tmp_path,
        capture_output=True,
        text=True,
        check=False,
    )
    assert started.returncode == 0
    assert started.stderr == ""
    assert "boundary" in started.stdout


def test_the_first_folder_that_takes_a_file_is_chosen(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("")
    homes: Sequence[Path] = [tmp_path / "file" / "below", tmp_path / "good", tmp_path / "later"]
    assert first_writable(homes) == tmp_path / "good"


def test_who_waits_for_another_start_says_so(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    gate = tmp_path / "gate"
    holder = subprocess.Popen(
        [sys.executable, "-c", HOLD, str(gate)], cwd=ROOT, stdout=subprocess.PIPE, text=True
    )
    assert holder.stdout is not None
    assert holder.stdout.readline() == "held\n"
    with alone(gate):
        assert "Another start is setting up" in capsys.readouterr().err
    holder.stdout.close()
    assert holder.wait() == 0


HOLD = """
import sys, time, pathlib
from app.bootstrap.environment import alone
with alone(pathlib.Path(sys.argv[1])):
    print("held", flush=True)
    time.sleep(0.5)
"""
