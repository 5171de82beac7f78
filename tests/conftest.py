"""What every test shares: which tests run, one seed for all, the browser and a small disk."""

from __future__ import annotations

import os
import shutil
import subprocess
from collections.abc import Iterator
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from tempfile import TemporaryDirectory
from typing import TYPE_CHECKING

import hypothesis
import pytest

if TYPE_CHECKING:
    from playwright.sync_api import Browser

# One thread, as in the program: sums depend on how many there are. Said before numpy is imported.
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

# The same examples in every run; a slow machine is no failure.
hypothesis.settings.register_profile("lookledger", deadline=None, derandomize=True, database=None)
hypothesis.settings.load_profile("lookledger")

CHROMIUM = ("chromium", "chromium-browser", "google-chrome")
CHROMIUM_FLAGS = [
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
]
NO_CHROMIUM = f"no Chromium on this machine (looked for {', '.join(CHROMIUM)})"
MOUNT = ("mount", "-t", "tmpfs", "-o", "size=1m,mode=700", "tmpfs")
NO_MOUNT = "a small disk cannot be mounted here (root may, where the machine lets it)"


def pytest_addoption(parser: pytest.Parser) -> None:
    parser.addoption("--quick", action="store_true", help="leave out the tests marked slow")
    parser.addoption("--bench", action="store_true", help="run the tests marked bench, and them alone")


def chromium_path() -> str | None:
    """The system's own Chromium; none is ever downloaded."""
    return next(filter(None, map(shutil.which, CHROMIUM)), None)


def browser_available() -> bool:
    """Whether browser tests run: in CI they always do, and fail where there is no browser."""
    return chromium_path() is not None or bool(os.environ.get("CI"))


@cache
def mount_available() -> bool:
    """Whether a small disk can be mounted, found out by mounting one."""
    if shutil.which(MOUNT[0]) is None:
        return False
    with TemporaryDirectory() as folder:
        mounted = subprocess.run([*MOUNT, folder], capture_output=True, check=False).returncode == 0
        if mounted:
            subprocess.run(["umount", "--lazy", folder], check=True)
    return mounted


@pytest.hookimpl(tryfirst=True)
def pytest_collection_modifyitems(config: pytest.Config, items: list[pytest.Item]) -> None:
    """Choose by --quick and --bench; mark browser tests before -m is read."""
    left_out = [item for item in items if is_left_out(item, config)]
    config.hook.pytest_deselected(items=left_out)
    items[:] = [item for item in items if item not in left_out]
    for item in items:
        if "chromium" in getattr(item, "fixturenames", ()):
            item.add_marker(pytest.mark.browser)
            if not browser_available():
                item.add_marker(pytest.mark.skip(reason=NO_CHROMIUM))
        if "small_disk" in getattr(item, "fixturenames", ()) and not mount_available():
            item.add_marker(pytest.mark.skip(reason=NO_MOUNT))


def is_left_out(item: pytest.Item, config: pytest.Config) -> bool:
    """Whether the options say that `item` does not run."""
    if (item.get_closest_marker("bench") is not None) != config.getoption("--bench"):
        return True
    return config.getoption("--quick") and item.get_closest_marker("slow") is not None


def pytest_terminal_summary(terminalreporter: pytest.TerminalReporter) -> None:
    """Say aloud which tests did not run, and what they need; nothing else may skip."""
    reasons = [str(report.longrepr) for report in terminalreporter.stats.get("skipped", [])]
    for heading, reason, remedy in (
        ("BROWSER TESTS DID NOT RUN", NO_CHROMIUM, "On Debian: apt install chromium"),
        ("TESTS ON A FULL AND A READ-ONLY DISK DID NOT RUN", NO_MOUNT, "Run them as root, as CI does"),
    ):
        n_left_out = sum(reason in said for said in reasons)
        if n_left_out:
            terminalreporter.section(heading, sep="!", red=True)
            terminalreporter.line(f"{n_left_out} left out: {reason}. {remedy}")


@dataclass(frozen=True)
class SmallDisk:
    """A file system of its own, of one megabyte."""

    path: Path

    def fill(self, but_bytes: int) -> None:
        """Leave room for so many bytes only, in whole pages of 4096."""
        self.empty()
        free = os.statvfs(self.path).f_bavail * 4096
        (self.path / "ballast").write_bytes(b"x" * max(0, free - but_bytes))

    def empty(self) -> None:
        (self.path / "ballast").unlink(missing_ok=True)

    def make_read_only(self) -> None:
        subprocess.run(["mount", "-o", "remount,ro", str(self.path)], check=True)


@pytest.fixture
def small_disk(tmp_path: Path) -> Iterator[SmallDisk]:
    path = tmp_path / "disk"
    path.mkdir()
    subprocess.run([*MOUNT, str(path)], check=True)
    try:
        yield SmallDisk(path)
    finally:
        subprocess.run(["umount", "--lazy", str(path)], check=True)


@pytest.fixture(scope="session")
def chromium() -> Iterator[Browser]:
    """The system's Chromium, headless; one for the whole run, so ask it for a fresh context in each test."""
    from playwright.sync_api import sync_playwright

    path = chromium_path()
    if path is None:
        pytest.fail(NO_CHROMIUM)
    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=path, args=CHROMIUM_FLAGS)
        yield browser
        browser.close()
