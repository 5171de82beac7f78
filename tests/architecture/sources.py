"""The tracked files, as the architecture tests read them."""

from __future__ import annotations

import ast
import re
import subprocess
from collections.abc import Iterator
from functools import cache
from pathlib import Path

from app.bootstrap.environment import ROOT

PICTURES = (".png", ".woff2", ".ttf", ".xpt")
VENDORED = ("static/plotly/", "static/fonts/")


@cache
def tracked() -> tuple[str, ...]:
    """Every file that git holds and that is there."""
    names = subprocess.check_output(["git", "ls-files", "-z"], cwd=ROOT, text=True).split("\0")
    return tuple(name for name in names if name and (ROOT / name).is_file())


@cache
def text(name: str) -> str:
    # tests/broken/ holds files that are no UTF-8 on purpose
    return (ROOT / name).read_text(encoding="utf-8", errors="replace")


def own_texts() -> list[str]:
    """What the project itself wrote: no pictures, locks or licences, nothing vendored."""
    return [name for name in tracked() if not name.endswith((*PICTURES, ".lock")) and not is_foreign(name)]


def is_foreign(name: str) -> bool:
    """Whether others wrote it: a licence belongs word for word to what it licenses."""
    return name.startswith(VENDORED) or Path(name).stem in ("LICENSE", "LICENCE")


def modules(folder: str) -> list[str]:
    return [name for name in tracked() if name.startswith(f"{folder}/") and name.endswith(".py")]


@cache
def tree(name: str) -> ast.Module:
    return ast.parse(text(name))


def functions(name: str) -> Iterator[ast.FunctionDef | ast.AsyncFunctionDef]:
    return (node for node in ast.walk(tree(name)) if isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef))


def matches(pattern: str, names: list[str]) -> list[str]:
    """`file:line: what` for each match in the named files."""
    compiled = re.compile(pattern)
    return [
        f"{name}:{number}: {match[0]}"
        for name in names
        for number, line in enumerate(text(name).splitlines(), 1)
        for match in compiled.finditer(line)
    ]


def exists(path: str) -> bool:
    return (ROOT / path).exists() or any(ROOT.glob(path)) if path else False


def top_level() -> set[str]:
    return {Path(name).parts[0] for name in tracked()}
