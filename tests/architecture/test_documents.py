"""What the code cites is in the documents, and what the documents and docstrings point to exists."""

from __future__ import annotations

import doctest
import importlib
import re
from types import ModuleType

import pytest

from tests.architecture.sources import exists, functions, matches, modules, own_texts, text, top_level

CITATION = r"DEVELOPERS\.md, Methods: ([^).;\"'`\n]+)"
PATH = r"(?<![\w/.-])(?!app/_assets)(?:app|tests|templates|static|demo_data)/[\w*./-]*\w"


def entries() -> set[str]:
    """The entries under Methods in DEVELOPERS.md: its sub-headings and the bold starts of its lines."""
    methods = text("DEVELOPERS.md").partition("\n## Methods")[2].partition("\n## ")[0]
    found = re.findall(r"^#{3,} +(.+?) *$|^(?:- )?\*\*(.+?)\.?\*\*", methods, re.MULTILINE)
    return {(heading or bold).strip().rstrip(".").lower() for heading, bold in found}


def citations() -> list[tuple[str, str]]:
    return [
        (name, cited.strip().lower())
        for name in [*modules("app"), *modules("tests")]
        for cited in re.findall(CITATION, " ".join(text(name).split()))
    ]


def test_every_method_that_the_code_cites_is_explained() -> None:
    known = entries()
    assert [citation for citation in citations() if citation[1] not in known] == []


def test_methods_are_cited() -> None:
    assert len(citations()) > 0


def test_every_path_that_a_text_names_exists() -> None:
    found = [match.rsplit(": ", 1) for match in matches(PATH, own_texts())]
    assert [f"{where}: {path}" for where, path in found if not exists(path)] == []


@pytest.mark.parametrize("command", ["python3 app", "python3 tests"])
def test_the_readme_shows_both_commands(command: str) -> None:
    assert command in text("README.md")


def test_both_documents_are_there() -> None:
    assert {"README.md", "DEVELOPERS.md"} <= top_level()


def test_examples_in_docstrings_are_true() -> None:
    names = [*modules("app/survival"), *modules("app/sequential")]
    assert {name: failed for name in names if (failed := doctest.testmod(imported(name)).failed)} == {}


def imported(name: str) -> ModuleType:
    return importlib.import_module(name.removesuffix(".py").removesuffix("/__init__").replace("/", "."))


def test_each_attack_in_the_table_is_a_test_and_each_test_of_an_attack_is_in_the_table() -> None:
    table = text("DEVELOPERS.md").partition("\n### Attacks")[2].partition("\n### ")[0]
    shown = set(re.findall(r"`(test_\w+)`", table))
    tests = {function.name for function in functions("tests/actions/test_attacks.py")}
    control = {"test_a_file_that_nobody_attacked_passes_with_its_witnessed_head"}
    assert shown == {name for name in tests if name.startswith("test_")} - control
