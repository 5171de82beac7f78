"""Sizes, imports and names of the program's own code."""

from __future__ import annotations

import ast
from collections.abc import Iterator

from tests.architecture.sources import functions, matches, modules, tree

VAGUE = {"utils", "util", "helpers", "helper", "manager", "data", "process", "handle", "res", "tmp"}


def lines(function: ast.FunctionDef | ast.AsyncFunctionDef) -> int:
    """Lines from `def` to the end, the docstring not counted."""
    first = function.body[0]
    is_docstring = isinstance(first, ast.Expr) and isinstance(first.value, ast.Constant)
    docstring = first.end_lineno - first.lineno + 1 if is_docstring else 0
    return function.end_lineno - function.lineno + 1 - docstring


def sizes() -> dict[str, int]:
    return {
        f"{name}:{function.lineno} {function.name}": lines(function)
        for name in modules("app")
        for function in functions(name)
    }


def test_no_function_is_longer_than_fifty_lines() -> None:
    assert {where: size for where, size in sizes().items() if size > 50} == {}


def test_nine_functions_in_ten_fit_in_thirty_lines() -> None:
    found = sizes().values()
    assert sum(size > 30 for size in found) <= len(found) / 10


def test_no_function_imports_our_own_package_as_that_hides_a_cycle() -> None:
    assert list(hidden_imports()) == []


def hidden_imports() -> Iterator[str]:
    for name in modules("app"):
        for function in functions(name):
            for node in ast.walk(function):
                if isinstance(node, ast.Import) and any(
                    alias.name.split(".")[0] == "app" for alias in node.names
                ):
                    yield f"{name}:{node.lineno}"
                if isinstance(node, ast.ImportFrom) and (node.module or "").split(".")[0] == "app":
                    yield f"{name}:{node.lineno}"


def test_no_name_is_so_vague_that_it_says_nothing() -> None:
    assert [where for where, name in named() if name.lower() in VAGUE] == []


def named() -> Iterator[tuple[str, str]]:
    """Each name that the program gives: modules, classes, functions, arguments and variables."""
    for name in modules("app"):
        yield from ((name, part.removesuffix(".py")) for part in name.split("/"))
        for node in ast.walk(tree(name)):
            if isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef | ast.ClassDef):
                yield f"{name}:{node.lineno} {node.name}", node.name
            elif isinstance(node, ast.arg):
                yield f"{name}:{node.lineno} {node.arg}", node.arg
            elif isinstance(node, ast.Name) and isinstance(node.ctx, ast.Store):
                yield f"{name}:{node.lineno} {node.id}", node.id


def test_no_class_is_a_manager_or_a_helper() -> None:
    assert matches(r"^\s*class \w*(Manager|Helper|Util)\w*", modules("app")) == []


def test_nothing_is_left_unfinished() -> None:
    assert matches(r"\b(TO[D]O|FIX[M]E|XX[X]|NotImplemented[E]rror)\b|[Ll]orem [i]psum", modules("app")) == []


def test_no_test_skips_but_the_browser_s_where_there_is_none() -> None:
    tests = [name for name in modules("tests") if name != "tests/conftest.py"]
    assert matches(r"pytest\.[s]kip|mark\.[s]kip|import[o]rskip|[S]kipTest", tests) == []
