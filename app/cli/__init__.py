"""The command line: finds the command, passes it settings, turns errors into a sentence and an exit code."""

from __future__ import annotations

import sys
import traceback
from collections.abc import Sequence
from importlib import import_module

from app.cli.parsing import Command, Parser, nearest_to, program_name
from app.errors import AppError, InputError
from app.settings import Settings

DEFAULT = "demo"
BROKE = 1
INTERRUPTED = 130

# Modules are imported by name, and only the one that is asked for: `boundary` then need not wait for the web
# server's packages, nor a server for what only other commands use.
COMMANDS = {
    "demo": "serve an invented trial at its third look, in a fresh trial file",
    "serve": "serve one trial file to this machine's browser",
    "start": "lock a plan into a new trial file",
    "amend": "record a new version of the plan, for the looks to come",
    "receive": "receive a snapshot, which opens a look",
    "refuse": "record that an extract was refused, and why",
    "freeze": "freeze the open look",
    "report": "write the files of a frozen look's report",
    "unmask": "name the arms behind the letters",
    "recommend": "record what the committee recommended after a look",
    "erratum": "correct in words what an entry of the history says",
    "backup": "copy the trial file, verify the copy and record it",
    "boundary": "compute the bounds of a plan",
    "evaluate": "compute looks under a plan, without a trial file",
    "verify": "check a trial file or a report against everything it says about itself",
    "validate": "recompute published results and show how far they are met",
}


def main(words: Sequence[str] | None = None) -> int:
    """Run one command; the exit code."""
    try:
        return run(list(sys.argv[1:] if words is None else words))
    except AppError as error:
        say(str(error))
        return error.exit_code
    except BrokenPipeError:
        sys.stderr.close()  # the reader of our output has left; Python would complain about it at exit
        return 0
    except KeyboardInterrupt:
        say("Stopped; what was not finished was not stored.")
        return INTERRUPTED
    except Exception as error:  # noqa: BLE001 - the last place that can still say a sentence
        say(broke(error))
        return BROKE


def run(words: list[str]) -> int:
    """Find the command that `words` begins with and hand it the rest."""
    name, rest = (words[0], words[1:]) if words else (DEFAULT, [])
    if name in ("-h", "--help", "help"):
        sys.stdout.write(overview())
        return 0
    if name not in COMMANDS:
        raise InputError(
            "there is no such command",
            found=repr(name),
            accepted=", ".join(COMMANDS),
            remedy=nearest_to(name, COMMANDS) or f"See '{program_name()} --help'",
        )
    command = load(name)
    options = Parser(name, COMMANDS[name], command).read(rest)
    return command.run(options, Settings())


def load(name: str) -> Command:
    """The command's own module, app.cli.NAME."""
    command: Command = import_module(f"{__name__}.{name}").COMMAND
    return command


def overview() -> str:
    """What `--help` shows without a command."""
    width = max(map(len, COMMANDS))
    lines = [f"  {name:<{width}}  {summary}" for name, summary in COMMANDS.items()]
    return "\n".join(
        (
            "Lookledger: the interim looks of one trial, for the statistician beside its committee.",
            "",
            f"usage: {program_name()} [COMMAND ...]     without a command: {DEFAULT}",
            "",
            *lines,
            "",
            f"'{program_name()} COMMAND --help' shows its options and an example.",
            "",
        )
    )


def broke(error: Exception) -> str:
    """A fault of the program in one sentence: where, and of what class; its message may hold values."""
    frame = traceback.extract_tb(error.__traceback__)[-1]
    where = f"{frame.filename.rpartition('/')[2]}, line {frame.lineno}"
    return (
        f"Something in the program broke in {where}. Found {type(error).__name__}. Nothing was half stored."
    )


def say(line: str) -> None:
    print(line, file=sys.stderr)
