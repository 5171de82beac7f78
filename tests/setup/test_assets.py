"""Checkout, editable install and wheel find the same templates, static files and demo data."""

from __future__ import annotations

import subprocess
import sys
import zipfile
from pathlib import Path

import pytest

from app.assets import asset
from app.bootstrap.environment import ROOT

FOLDERS = ("templates", "static", "demo_data")
ASK = "import sys; from app.assets import asset; print(*map(asset, sys.argv[1:]), sep='\\n')"


def found(site: Path) -> list[Path]:
    """Where a program with the packages of `site` finds the folders; -I keeps this checkout out of it."""
    command = [sys.executable, "-I", "-c", f"import site; site.addsitedir({str(site)!r}); {ASK}", *FOLDERS]
    return list(map(Path, subprocess.check_output(command, cwd=site, text=True).splitlines()))


def build(kind: str, folder: Path) -> Path:
    """Build a wheel of the checkout as an installer would, without the network, and unpack it."""
    ask = f"import sys; from hatchling.build import {kind}; print({kind}(sys.argv[1]))"
    name = subprocess.check_output([sys.executable, "-c", ask, str(folder)], cwd=ROOT, text=True).split()[-1]
    with zipfile.ZipFile(folder / name) as archive:
        archive.extractall(folder / "site")
    return folder / "site"


def test_a_checkout_finds_them_beside_the_program() -> None:
    assert [asset(folder) for folder in FOLDERS] == [ROOT / folder for folder in FOLDERS]


@pytest.mark.slow
def test_a_wheel_finds_them_inside_itself(tmp_path: Path) -> None:
    site = build("build_wheel", tmp_path)
    assert found(site) == [site / "app" / "_assets" / folder for folder in FOLDERS]


@pytest.mark.slow
def test_a_wheel_holds_each_tracked_file_of_the_program(tmp_path: Path) -> None:
    site = build("build_wheel", tmp_path)
    tracked = subprocess.check_output(["git", "ls-files", "app", *FOLDERS], cwd=ROOT, text=True).splitlines()
    places = {name: name if name.startswith("app/") else f"app/_assets/{name}" for name in tracked}
    assert [name for name, place in places.items() if not (site / place).is_file()] == []


@pytest.mark.slow
def test_an_editable_install_finds_them_in_the_checkout(tmp_path: Path) -> None:
    site = build("build_editable", tmp_path)
    assert found(site) == [ROOT / folder for folder in FOLDERS]


def test_a_name_that_is_not_shipped_is_a_bug_told_with_both_places() -> None:
    with pytest.raises(FileNotFoundError, match=r"none\.html is not shipped; looked in .*_assets and "):
        asset("none.html")
