"""What went wrong, as an answer: a page for a person, one JSON form for a program."""

from __future__ import annotations

from dataclasses import dataclass

from starlette.responses import JSONResponse, Response

from app.errors import (
    AccuracyNotReached,
    AppError,
    InputError,
    LedgerChanged,
    LedgerError,
    NotEstimable,
    SetupError,
)
from app.web.pages import Pages

FOR_PROGRAMS = (".json", ".csv")


TO_THE_NEWEST = ("/", "To the newest look")
TO_VERIFYING = ("/closed/verify", "Verify the trial file")


@dataclass(frozen=True)
class Problem:
    """An answer that is not what was asked for: its status, the line on top, the sentence, the ways on."""

    status: int
    heading: str
    error: AppError
    ways_on: tuple[tuple[str, str], ...] = (TO_THE_NEWEST,)


class Refused(AppError):
    """The gate, or the server before any route, does not let a request through."""


BY_CLASS: tuple[tuple[type[AppError], int, str], ...] = (
    (InputError, 422, "This cannot be done as given."),
    (NotEstimable, 422, "The extract cannot answer this."),
    (AccuracyNotReached, 500, "The accuracy wanted was not reached."),
    (LedgerChanged, 409, "The trial file is not as it was written."),
    (LedgerError, 409, "The history does not allow this."),
    (SetupError, 500, "The machine or folder is not ready for this."),
)


def problem_of(error: AppError) -> Problem:
    """The status and heading that belong to the class of an error."""
    ways_on = (TO_VERIFYING,) if isinstance(error, LedgerChanged) else (TO_THE_NEWEST,)
    for kind, status, heading in BY_CLASS:
        if isinstance(error, kind):
            return Problem(status, heading, error, ways_on)
    return Problem(422, "This cannot be done as given.", error, ways_on)


def not_for_the_open_side(error: AppError) -> Problem:
    """What failed may name bytes, digests or rows of closed data: the open side is told that, and no more."""
    told = Refused(
        "this page cannot be shown at present",
        remedy="Ask the statistician who serves the closed side",
    )
    return Problem(problem_of(error).status, "This cannot be shown.", told, ways_on=())


def no_such_page(path: str) -> Problem:
    error = Refused(
        "there is no page at this address",
        found=repr(path[:80]),
        accepted="the addresses that the pages link to",
        remedy="Go back to the newest look",
    )
    return Problem(404, "There is no such page.", error)


def wrong_method(method: str) -> Problem:
    error = Refused(
        "this address does not take that kind of request",
        found=repr(method[:20]),
        remedy="Go back, and use the link or button of the page",
    )
    return Problem(405, "This address is used in another way.", error)


def not_understood(detail: str) -> Problem:
    error = Refused(
        "the request could not be read",
        found=repr(detail[:200]),
        accepted="what the forms of these pages send",
        remedy="Go back, reload the page and send the form again",
    )
    return Problem(400, "The request could not be read.", error)


def too_large(limit_bytes: int) -> Problem:
    error = Refused(
        "more was sent at once than is accepted",
        where="this form",
        accepted=f"up to {size_text(limit_bytes)}",
        remedy="Nothing was stored; send fewer or smaller files",
    )
    return Problem(413, "Too much was sent at once.", error)


def broke(incident: str) -> Problem:
    error = Refused(
        "something in the program broke",
        found=f"incident {incident}",
        remedy="Acts are stored wholly or not at all, so nothing is half done. "
        "Quote the incident when you report it; the terminal shows where it happened",
    )
    return Problem(500, "Something in the program broke.", error)


def size_text(n_bytes: int) -> str:
    """ "64 MiB", "256 KiB"; whole units only, as limits are."""
    for unit, size in (("MiB", 2**20), ("KiB", 2**10)):
        if n_bytes >= size:
            return f"{n_bytes // size} {unit}"
    return f"{n_bytes} bytes"


def answer(pages: Pages, problem: Problem, path: str) -> Response:
    """The problem in the form that suits who asked."""
    if path.endswith(FOR_PROGRAMS):
        return JSONResponse(as_json(problem), status_code=problem.status)
    return pages.show("problem", status=problem.status, problem=problem)


def as_json(problem: Problem) -> dict[str, object]:
    """The one JSON form of every error."""
    error = problem.error
    return {
        "status": problem.status,
        "kind": type(error).__name__,
        "sentence": str(error),
        "what": error.what,
        "where": error.where,
        "found": error.found,
        "accepted": error.accepted,
        "remedy": error.remedy,
    }
