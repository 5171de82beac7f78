"""What a person says in words, kept as said but never empty and never endless."""

from __future__ import annotations

from app.errors import ValueRejected

LONGEST_NAME = 120
LONGEST_REASON = 2000


def recorded_name(by: str) -> str:
    """Who says they act."""
    return said(by, "the name of who acts", LONGEST_NAME, "say who acts")


def recorded_reason(reason: str) -> str:
    return said(reason, "the reason", LONGEST_REASON, "give the reason in a sentence")


def said(text: str, what: str, longest: int, remedy: str) -> str:
    """The text without surrounding blanks, on one line of printable characters."""
    kept = " ".join(text.split())
    if not kept:
        raise ValueRejected(f"{what} is missing", accepted=f"1 to {longest} characters", remedy=remedy)
    if len(kept) > longest or not kept.isprintable():
        raise ValueRejected(
            f"{what} cannot be recorded as given",
            found=f"{len(kept)} characters" if len(kept) > longest else "characters that cannot be printed",
            accepted=f"1 to {longest} printable characters",
            remedy=remedy,
        )
    return kept
