"""The locks: every package of both, by version and hash, the same numbers on every supported Python."""

from __future__ import annotations

import re
import runpy
import tomllib
from functools import cache
from pathlib import Path

import pytest
from packaging.requirements import Requirement

from app.bootstrap.environment import ROOT, RUNTIME

LOCKS = {
    "app": ROOT / "app" / "requirements.lock",
    "tests": ROOT / "tests" / "requirements.lock",
    "peers": ROOT / "tests" / "peers.lock",
}
PIN = re.compile(r"^(?P<name>[a-z0-9][a-z0-9._-]*)==(?P<version>[\w.]+)(?: ; (?P<marker>[^\\]+))? \\$")
HASH = re.compile(r"^    --hash=sha256:[0-9a-f]{64}(?: \\)?$")


@cache
def pins(lock: Path) -> dict[str, tuple[str, str | None]]:
    """Version and marker of each package."""
    matches = filter(None, map(PIN.match, lock.read_text().splitlines()))
    return {match["name"]: (match["version"], match["marker"]) for match in matches}


def named(requirements: list[str]) -> set[str]:
    return {re.split(r"[<>=!~ \[;]", requirement)[0] for requirement in requirements}


def project() -> dict:
    return tomllib.loads((ROOT / "pyproject.toml").read_text())["project"]


@pytest.mark.parametrize("lock", LOCKS.values(), ids=LOCKS)
def test_each_line_is_a_version_or_a_hash_and_no_address(lock: Path) -> None:
    strange = [line for line in lock.read_text().splitlines() if not PIN.match(line) and not HASH.match(line)]
    assert strange == []


@pytest.mark.parametrize("lock", LOCKS.values(), ids=LOCKS)
def test_each_version_carries_a_hash(lock: Path) -> None:
    lines = lock.read_text().splitlines()
    bare = [
        line
        for line, below in zip(lines, [*lines[1:], ""], strict=True)
        if PIN.match(line) and not HASH.match(below)
    ]
    assert bare == []


def test_the_tests_run_against_the_versions_that_the_program_runs_with() -> None:
    assert pins(LOCKS["app"]).items() <= pins(LOCKS["tests"]).items()


def test_the_versions_lie_within_the_bounds_that_the_project_states() -> None:
    stated = [*project()["dependencies"], *project()["optional-dependencies"]["test"]]
    wanted = {requirement.name: requirement.specifier for requirement in map(Requirement, stated)}
    outside = [name for name, bounds in wanted.items() if pins(LOCKS["tests"])[name][0] not in bounds]
    assert outside == []


@pytest.mark.parametrize("name", ["numpy", "scipy"])
def test_the_libraries_are_met_with_the_numbers_that_the_program_computes(name: str) -> None:
    assert pins(LOCKS["peers"])[name] == pins(LOCKS["app"])[name]


@pytest.mark.parametrize("name", ["numpy", "scipy"])
def test_numbers_cannot_split_between_pythons(name: str) -> None:
    assert pins(LOCKS["app"])[name][1] is None


def test_the_program_s_lock_holds_each_dependency_of_the_project() -> None:
    assert named(project()["dependencies"]) <= pins(LOCKS["app"]).keys()


def test_the_tests_lock_holds_each_dependency_of_the_tests() -> None:
    assert named(project()["optional-dependencies"]["test"]) <= pins(LOCKS["tests"]).keys()


def test_the_modules_that_a_start_looks_for_are_the_project_s_dependencies() -> None:
    assert {name.replace("_", "-") for name in RUNTIME} == named(project()["dependencies"])


IMPORTED_AS = {
    "pytest-xdist": "xdist",
    "import-linter": "importlinter",
    "axe-playwright-python": "axe_playwright_python",
}
STUBS = {"pandas-stubs"}


def test_the_modules_that_the_tests_look_for_are_their_dependencies() -> None:
    needs = runpy.run_path(str(ROOT / "tests" / "__main__.py"))["NEEDS"]
    wanted = named(project()["optional-dependencies"]["test"]) - STUBS
    assert set(needs) - set(RUNTIME) == {IMPORTED_AS.get(name, name) for name in wanted}


def test_each_dependency_has_its_reason_beside_it() -> None:
    lines = (
        (ROOT / "pyproject.toml")
        .read_text()
        .partition("\ndependencies = [")[2]
        .partition("]")[0]
        .splitlines()
    )
    assert [line for line in lines if line.strip() and "# " not in line] == []
