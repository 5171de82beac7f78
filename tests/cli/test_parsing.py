"""Words after a command: read, or refused in one sentence that names the nearest thing meant."""

from __future__ import annotations

import shlex
import subprocess
import sys
from argparse import Namespace
from datetime import date
from pathlib import Path

import pytest

from app.cli import COMMANDS, load, main
from app.cli.parsing import Parser, program_name
from app.errors import InputError


def read(command: str, words: str) -> Namespace:
    return Parser(command, COMMANDS[command], load(command)).read(shlex.split(words))


@pytest.mark.parametrize("command", COMMANDS)
def test_help_shows_an_example_that_can_be_run_as_it_stands(
    command: str, capsys: pytest.CaptureFixture[str]
) -> None:
    with pytest.raises(SystemExit) as ended:
        main([command, "--help"])
    assert ended.value.code == 0
    example = load(command).example
    assert f"example:\n  {program_name()} {example}\n" in capsys.readouterr().out
    name, _, rest = example.partition(" ")
    assert name == command
    read(command, rest)


def test_the_overview_names_every_command(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["--help"]) == 0
    shown = capsys.readouterr().out
    assert [name for name in COMMANDS if f"\n  {name} " not in shown] == []


@pytest.mark.parametrize(
    ("words", "sentence"),
    [
        (["recieve"], "There is no such command. Found 'recieve'. "),
        (["evaluate", "p.toml", "--luk", "a.csv"], "There is no such option in 'python3 app evaluate'."),
        (["boundary"], "Something is missing in 'python3 app boundary'. Found no PLAN."),
        (["report", "t.trial", "--to", "x"], "Something is missing in 'python3 app report'. Found no LOOK."),
        (["report", "t.trial", "two", "--to", "x"], "There is no such look in LOOK. Found 'two'."),
        (["serve", "t.trial", "--port", "99999"], "There is no such port in --port. Found '99999'."),
        (["serve", "t.trial", "u.trial"], "More was given than the command takes in 'python3 app serve'."),
        (["serve", "t.trial", "--no-browser=yes"], "An option takes no value in 'python3 app serve'."),
        (["freeze", "t.trial", "--by"], "An option has no value in 'python3 app freeze'."),
        (["boundary", "p.toml", "--at", "0.3;0.6"], "A fraction is not a number in --at. Found '0.3;0.6'."),
    ],
)  # fmt: skip
def test_words_that_cannot_be_meant_get_one_sentence(
    words: list[str], sentence: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(words) == 2
    printed = capsys.readouterr()
    assert printed.out == ""
    assert printed.err.startswith(sentence)
    assert printed.err.count("\n") == 1


def test_the_nearest_command_and_option_are_named(capsys: pytest.CaptureFixture[str]) -> None:
    main(["recieve"])
    main(["receive", "t.trial", "a.csv", "--cutof", "2026-10-09"])
    printed = capsys.readouterr().err
    assert "Write 'receive' if that is meant." in printed
    assert "Write '--cutoff' if that is meant." in printed


def test_cutoff_and_kind_belong_to_the_look_before_them() -> None:
    options = read(
        "evaluate", "p.toml --look a.csv,b.csv --kind safety --look c.csv --cutoff 2026-01-09 --look d.csv"
    )
    assert [(look.files, look.cutoff, look.kind) for look in options.looks] == [
        ((Path("a.csv"), Path("b.csv")), None, "safety"),
        ((Path("c.csv"),), date(2026, 1, 9), None),
        ((Path("d.csv"),), None, None),
    ]


@pytest.mark.parametrize(
    ("words", "sentence"),
    [
        ("p.toml --cutoff 2026-01-09 --look a.csv", "An option stands before the look it belongs to"),
        ("p.toml --look a.csv --kind final --kind safety", "One look has the same option twice"),
        ("p.toml --look a.csv --kind fnal", "This is no kind of look in --kind. Found 'fnal'."),
        ("p.toml --look a.csv --cutoff 20260109", "There is no such date in --cutoff. Found '20260109'."),
    ],
)
def test_options_of_a_look_that_cannot_be_are_refused(words: str, sentence: str) -> None:
    with pytest.raises(InputError) as refused:
        read("evaluate", words)
    assert str(refused.value).startswith(sentence)


def test_an_acknowledgement_is_an_id_and_a_reason() -> None:
    words = "t.trial a.csv --cutoff 2026-10-09 --by X --acknowledge study-differs='a = b' --acknowledge x=y"
    assert read("receive", words).acknowledge == [("study-differs", "a = b"), ("x", "y")]
    with pytest.raises(InputError, match="An acknowledgement is not complete in --acknowledge"):
        read("receive", "t.trial a.csv --cutoff 2026-10-09 --by X --acknowledge study-differs")


def test_a_fault_of_the_program_is_told_without_a_traceback_or_a_value(
    capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    words = ["report", "01-017\x00.trial", "1", "--to", str(tmp_path)]  # no file system takes a NUL
    code = main(words)
    printed = capsys.readouterr().err
    assert code in (1, 2, 5)
    assert "Traceback" not in printed
    assert printed.count("\n") == 1


ASKS_WHAT_WAS_IMPORTED = """
import sys
from app.cli import main
main(["boundary", sys.argv[1]])
imported = {name.split(".")[0] for name in sys.modules}
print(sorted(imported & {"fastapi", "starlette", "uvicorn", "jinja2", "plotly"}))
"""


def test_boundary_does_not_wait_for_the_server_s_packages() -> None:
    command = [sys.executable, "-c", ASKS_WHAT_WAS_IMPORTED, "demo_data/plan.toml"]
    root = Path(__file__).resolve().parents[2]
    printed = subprocess.check_output(command, cwd=root, text=True)
    assert printed.splitlines()[-1] == "[]"
