"""Which arm is called A and which B: drawn when the plan is locked, committed to, revealed once.

The commitment is the SHA-256 of a canonical JSON text {"letters", "salt"}. The history holds the commitment,
so the letters cannot be exchanged later; the salt keeps anyone from trying out both possibilities. The text
itself lies in the trial file, apart from the history: whoever holds the file can unmask, so it is closed
material.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import asdict, dataclass
from typing import Literal

from app.record.canonical import canonical_bytes, digest

Letter = Literal["A", "B"]


@dataclass(frozen=True)
class Letters:
    """The letter of each arm; never the same."""

    control: Letter
    experimental: Letter


@dataclass(frozen=True)
class LetterKey:
    """What opens the commitment: the letters and the salt (64 hex digits)."""

    letters: Letters
    salt: str

    @property
    def sealed(self) -> bytes:
        """The text that is committed to."""
        return canonical_bytes(asdict(self))

    @property
    def commitment(self) -> str:
        return digest(self.sealed)


def draw_letters(random_bytes: Callable[[int], bytes]) -> LetterKey:
    """Throw the coin and draw the salt."""
    heads = random_bytes(1)[0] & 1
    letters = Letters("A", "B") if heads else Letters("B", "A")
    return LetterKey(letters, random_bytes(32).hex())
