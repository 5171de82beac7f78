"""What is shipped: faces whole with their licences, the chart library as published, every place."""

from __future__ import annotations

import hashlib
import re
from pathlib import Path

import pytest

from app.assets import asset

STATIC = Path(asset("static"))


@pytest.mark.parametrize(
    ("file", "digest"),
    [
        ("plotly/plotly-basic.min.js", "99784e3abfb07b142a15e521a439e6d9addceadb3f79553fd24c72774f0649ba"),
    ],
)
def test_a_vendored_file_is_as_published(file: str, digest: str) -> None:
    """SHA-256 of plotly-basic.min.js in plotly.js-basic-dist-min 4.1.1."""
    content = (STATIC / file).read_bytes()
    assert hashlib.sha256(content).hexdigest() == digest
    assert (STATIC / file).with_name("SHA256").read_text().split() == [digest, Path(file).name]


@pytest.mark.parametrize("folder", ["fonts/source-serif", "fonts/source-sans"])
def test_faces_are_whole_files_with_their_licence_beside_them(folder: str) -> None:
    faces = sorted((STATIC / folder).glob("*.woff2"))
    assert faces
    assert all(face.read_bytes()[:4] == b"wOF2" and face.stat().st_size > 50_000 for face in faces)
    assert "SIL Open Font License, Version 1.1" in (STATIC / folder / "LICENSE.md").read_text(
        encoding="utf-8"
    )


def test_every_file_that_the_style_names_is_there() -> None:
    style = (STATIC / "lookledger.css").read_text(encoding="utf-8")
    named = re.findall(r'url\("([^"]+)"\)', style)
    assert len(named) == 5
    assert all((STATIC / name).is_file() for name in named)


def test_places_run_from_0_to_1000_thousandths() -> None:
    rules = re.findall(
        r"\.t(\d{3,4})\{--t:([\d.]+)\}", (STATIC / "positions.css").read_text(encoding="utf-8")
    )
    assert [int(number) for number, _ in rules] == list(range(1001))
    assert all(float(value) == int(number) / 1000 for number, value in rules)


@pytest.mark.parametrize(
    "file", ["lookledger.css", "lookledger.js", "positions.css", "favicon.svg", "plotly/plotly.css"]
)
def test_nothing_of_ours_names_another_address(file: str) -> None:
    text = (STATIC / file).read_text(encoding="utf-8").replace("http://www.w3.org/2000/svg", "")
    assert "//" not in re.sub(r"(?m)^\s*//.*$", "", text)
