"""The two keys made at each start: whoever holds one may enter that side."""

from __future__ import annotations

import base64
import hmac
from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Literal

Side = Literal["closed", "open"]

KEY_BYTES = 32


def random_word(random_bytes: Callable[[int], bytes], n_bytes: int = KEY_BYTES) -> str:
    """A word that nobody guesses and every address bar keeps."""
    return base64.urlsafe_b64encode(random_bytes(n_bytes)).rstrip(b"=").decode("ascii")


@dataclass(frozen=True)
class Keys:
    """Valid until the server stops; not shown by repr, so that no log line can carry one."""

    closed: str = field(repr=False)
    open: str = field(repr=False)

    @classmethod
    def made_from(cls, random_bytes: Callable[[int], bytes]) -> Keys:
        return cls(closed=random_word(random_bytes), open=random_word(random_bytes))

    def side_of(self, key: str) -> Side | None:
        """The side that `key` opens. Both are always compared, and in constant time."""
        is_closed = is_same(key, self.closed)
        is_open = is_same(key, self.open)
        if is_closed:
            return "closed"
        return "open" if is_open else None


def is_same(given: str, kept: str) -> bool:
    """Whether two words are equal, in a time that does not tell how far they agree."""
    return hmac.compare_digest(given.encode("utf-8", "replace"), kept.encode("utf-8"))
