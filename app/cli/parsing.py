"""Options read with argparse, refused in our own sentences."""

from __future__ import annotations

import argparse
import re
import sys
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from datetime import date
from difflib import get_close_matches
from pathlib import Path
from typing import Any, NoReturn

from app.errors import InputError, ValueRejected
from app.intake.answers import read_day, read_hazard_ratio, read_kind
from app.model.extract import LookKind
from app.settings import Settings


@dataclass(frozen=True)
class Command:
    """One command: how its options are declared, what it does, and an example that its help shows."""

    arguments: Callable[[argparse.ArgumentParser], None]
    run: Callable[[argparse.Namespace, Settings], int]
    example: str


class Parser(argparse.ArgumentParser):
    """Reads the words after a command's name."""

    def __init__(self, name: str, summary: str, command: Command) -> None:
        self.option_names: list[str] = []
        super().__init__(
            prog=f"{program_name()} {name}",
            description=f"{summary[0].upper()}{summary[1:]}.",
            epilog=f"example:\n  {program_name()} {command.example}",
            formatter_class=argparse.RawDescriptionHelpFormatter,
            allow_abbrev=False,
        )
        command.arguments(self)

    def add_argument(self, *names: Any, **settings: Any) -> argparse.Action:
        self.option_names += [name for name in names if name.startswith("--")]
        return super().add_argument(*names, **settings)

    def read(self, words: Sequence[str]) -> argparse.Namespace:
        """The options in `words`; an unknown one is named before argparse can call something else missing."""
        for word in words:
            name = word.partition("=")[0]
            if word == "--":
                break
            if name.startswith("-") and name not in ("-", "-h", *self.option_names):
                self.refuse_option(name)
        return self.parse_args(words)

    def refuse_option(self, name: str) -> NoReturn:
        raise InputError(
            "there is no such option",
            where=f"'{self.prog}'",
            found=repr(name),
            accepted=", ".join(self.option_names),
            remedy=nearest_to(name, self.option_names) or f"See '{self.prog} --help'",
        )

    def error(self, message: str) -> NoReturn:
        """What argparse noticed, said our way."""
        what, found = in_our_words(message)
        raise InputError(what, where=f"'{self.prog}'", found=found, remedy=f"See '{self.prog} --help'")


ARGPARSE_SAYS = (
    (r"the following arguments are required: (.+)", "something is missing", "no {}"),
    (r"argument (\S+): expected (?:one|at least one) argument", "an option has no value", "nothing after {}"),
    (r"unrecognized arguments: (.+)", "more was given than the command takes", "{}"),
    (r"argument (\S+): ignored explicit argument (.+)", "an option takes no value", "{}={}"),
)


def in_our_words(message: str) -> tuple[str, str]:
    """What is wrong, and what was found, from a message of argparse."""
    for pattern, what, found in ARGPARSE_SAYS:
        match = re.fullmatch(pattern, message)
        if match:
            return what, found.format(*match.groups())
    return "the options cannot be read", message


def nearest_to(word: str, known: Iterable[str]) -> str:
    """ "Write 'receive' if that is meant", or nothing when nothing is near."""
    nearest = get_close_matches(word, list(known), n=1, cutoff=0.6)
    return f"Write {nearest[0]!r} if that is meant" if nearest else ""


def program_name() -> str:
    """How the program was started, as help and examples repeat it."""
    return "lookledger" if Path(sys.argv[0]).stem == "lookledger" else "python3 app"


def day_of(option: str) -> Callable[[str], date]:
    return lambda text: read_day(text, where=option)


def kind(text: str) -> LookKind:
    return read_kind(text, where="--kind")


def hazard_ratio(text: str) -> float:
    return read_hazard_ratio(text, where="--hazard-ratio")


def fractions(text: str) -> tuple[float, ...]:
    """Information fractions separated by commas; that they increase is for the plan's rules to say."""
    try:
        return tuple(float(part) for part in text.split(","))
    except ValueError:
        raise ValueRejected(
            "a fraction is not a number",
            where="--at",
            found=repr(text),
            accepted="numbers above 0, separated by commas, such as 0.3,0.6",
        ) from None


def acknowledgement(text: str) -> tuple[str, str]:
    """A doubt's id and the reason why it may stand."""
    finding, given, reason = text.partition("=")
    if not (given and finding.strip() and reason.strip()):
        raise ValueRejected(
            "an acknowledgement is not complete",
            where="--acknowledge",
            found=repr(text),
            accepted="ID=REASON, such as late-extract='the site was closed'",
        )
    return finding.strip(), reason.strip()


def port(text: str) -> int:
    if text.isdecimal() and len(text) <= 5 and int(text) <= 65535:
        return int(text)
    raise ValueRejected(
        "there is no such port", where="--port", found=repr(text), accepted="a whole number from 0 to 65535"
    )


def entry_number(text: str) -> int:
    if text.isdecimal() and 0 < len(text) <= 9 and int(text) > 0:
        return int(text)
    raise ValueRejected(
        "there is no such entry",
        where="ENTRY",
        found=repr(text),
        accepted="a number as the history on the Record sheet shows it, such as 7",
    )


def look_number(text: str) -> int:
    if text.isdecimal() and 0 < len(text) <= 4 and int(text) > 0:
        return int(text)
    raise ValueRejected(
        "there is no such look",
        where="LOOK",
        found=repr(text),
        accepted="a number as the spine shows it, such as 2",
    )
