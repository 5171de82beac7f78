"""Each broken extract on the command line: every sentence on stderr, a trial file that nothing touched."""

from __future__ import annotations

from pathlib import Path

import pytest

from app.cli import main
from tests.broken.test_broken_extracts import BROKEN, EXPECTED, FINDINGS, FOLDER


@pytest.fixture(scope="module")
def trial(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("broken") / "waiting.trial"
    assert main(["start", str(FOLDER / "plan.toml"), str(path), "--by", "Jane Roe"]) == 0
    return path


@pytest.mark.parametrize("name", BROKEN)
def test_each_finding_is_told_and_nothing_is_stored(
    trial: Path, name: str, capsys: pytest.CaptureFixture[str]
) -> None:
    before = trial.read_bytes()
    cutoff = EXPECTED["cutoff"].isoformat()
    words = ["receive", str(trial), str(FOLDER / name), "--cutoff", cutoff, "--by", "Jane Roe"]
    needs_answer = any(finding["severity"] in ("block", "doubt") for finding in FINDINGS[name])
    assert needs_answer
    assert main(words) == 2
    told = capsys.readouterr().err
    for finding in FINDINGS[name]:
        name_of_it = "" if finding["severity"] == "block" else f"{finding['severity']} {finding['id']}: "
        assert told.count(f"{name_of_it}{finding['sentence']}") == 1
    assert trial.read_bytes() == before
