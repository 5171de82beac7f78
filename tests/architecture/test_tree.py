"""The top level and what the first start may import."""

from __future__ import annotations

import json
import subprocess
import sys
from hashlib import sha256

from app.bootstrap.environment import ROOT
from tests.architecture.sources import matches, modules, top_level

ALLOWED = {
    "README.md",
    "DEVELOPERS.md",
    "pyproject.toml",
    "app",
    "templates",
    "static",
    "tests",
    "demo_data",
}

IMPORTED = """
import json, sys
before = set(sys.modules)
sys.path.insert(0, sys.argv[1])
import app.bootstrap.environment
print(json.dumps(sorted(set(sys.modules) - before)))
"""


def test_the_top_level_holds_what_a_reader_expects_and_nothing_else() -> None:
    assert {name for name in top_level() if not name.startswith(".")} <= ALLOWED


def test_the_first_start_needs_the_standard_library_only() -> None:
    command = [sys.executable, "-I", "-S", "-c", IMPORTED, str(ROOT)]
    imported = json.loads(subprocess.check_output(command, text=True))
    ours = {name for name in imported if name.split(".")[0] == "app"}
    foreign = {name for name in imported if name.split(".")[0] not in sys.stdlib_module_names} - ours
    assert foreign == set()
    assert {name for name in ours if not name.startswith("app.bootstrap")} == {"app", "app.errors"}


def test_nothing_imports_scipy_stats_which_alone_costs_almost_half_a_second() -> None:
    assert matches(r"\bscipy\.stats\b|from scipy import .*\bstats\b", modules("app")) == []


def test_the_script_that_draws_figures_is_the_one_whose_digest_is_kept() -> None:
    folder = ROOT / "static" / "plotly"
    kept = dict(reversed(line.split()) for line in (folder / "SHA256").read_text().splitlines())
    assert kept == {
        name: sha256((folder / name).read_bytes()).hexdigest() for name in ("plotly-basic.min.js",)
    }
