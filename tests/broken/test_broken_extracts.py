"""Every broken extract gives its findings, with full sentences; README.md says what is wrong in each."""

from __future__ import annotations

import re
import tomllib
from collections import defaultdict
from pathlib import Path
from typing import Any

import pytest

from app.intake.extract import read_extract, received_file
from app.intake.plan import read_plan
from app.model.extract import Extract
from app.settings import Limits

FOLDER = Path(__file__).parent
EXPECTED = tomllib.loads((FOLDER / "expected.toml").read_text(encoding="utf-8"))
PLAN = read_plan((FOLDER / "plan.toml").read_bytes(), name="plan.toml", limits=Limits())
BROKEN = sorted(path.name for path in FOLDER.glob("*.csv") if path.name != "sound.csv")


def expected_findings() -> dict[str, list[dict[str, Any]]]:
    by_file = defaultdict(list)
    for finding in EXPECTED["finding"]:
        by_file[finding.pop("file")].append(finding)
    return by_file


FINDINGS = expected_findings()


def read(name: str) -> Extract:
    file = received_file(name, (FOLDER / name).read_bytes())
    return read_extract([file], PLAN, cutoff=EXPECTED["cutoff"], limits=Limits())


@pytest.mark.parametrize("name", BROKEN)
def test_a_broken_extract_gives_exactly_its_findings(name):
    found = [
        {
            "id": each.id,
            "severity": each.severity,
            "rows": list(each.rows),
            "count": each.count,
            "sentence": str(each),
        }
        for each in read(name).findings
    ]
    assert found == FINDINGS[name]


@pytest.mark.parametrize("name", BROKEN)
def test_a_sample_is_made_exactly_when_nothing_blocks(name):
    blocks = any(each["severity"] == "block" for each in FINDINGS[name])
    assert (read(name).sample is None) == blocks


@pytest.mark.parametrize("name", BROKEN)
def test_no_sentence_names_a_subject(name):
    for each in read(name).findings:
        assert not re.search(r"B1-\d{3}", str(each))


def test_the_extract_they_were_made_from_has_no_finding():
    extract = read("sound.csv")
    assert extract.findings == ()
    assert extract.sample is not None
    assert extract.sample.event.sum() == 5


def test_the_list_names_every_file_and_no_other():
    listed = re.findall(
        r"^\| (\S+\.csv) \| \S", (FOLDER / "README.md").read_text(encoding="utf-8"), re.MULTILINE
    )
    assert listed == BROKEN
    assert sorted(FINDINGS) == BROKEN
