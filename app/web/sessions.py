"""Who has entered: sessions live in memory only and end with the server, by leaving, or by time."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass
from datetime import datetime, timedelta

from app.actions.desk import UploadedFile
from app.actions.receive import Incoming, Understanding
from app.settings import Settings
from app.web.keys import Side, random_word

ID_BYTES = 9


@dataclass(frozen=True, eq=False)
class Upload:
    """Files that were read and not yet received. They wait in memory; nothing of them is on disk."""

    token: str
    incoming: Incoming
    understood: Understanding


@dataclass(frozen=True, eq=False)
class PlanUpload:
    """A plan that was read and not yet recorded as an amendment; it waits in memory."""

    token: str
    file: UploadedFile


@dataclass(eq=False)
class Session:
    """One browser that entered. `id` goes into the history and says nothing about the cookie."""

    id: str
    side: Side
    began: datetime
    seen: datetime
    by: str = ""
    upload: Upload | None = None
    refused: Upload | None = None
    plan: PlanUpload | None = None


class Sessions:
    """All sessions of one server, found by the cookie that was given out at entering."""

    def __init__(self, settings: Settings) -> None:
        self._settings = settings
        self._by_digest: dict[bytes, Session] = {}

    def begin(self, side: Side, *, by: str = "") -> str:
        """The cookie of a new session. Ended ones are forgotten here, with the uploads they held."""
        now = self._settings.clock()
        for digest, session in list(self._by_digest.items()):
            if self._is_over(session, now):
                self._by_digest.pop(digest, None)
        cookie = random_word(self._settings.random_bytes)
        identity = random_word(self._settings.random_bytes, ID_BYTES)
        self._by_digest[digest_of(cookie)] = Session(identity, side, began=now, seen=now, by=by)
        return cookie

    def find(self, cookie: str) -> Session | None:
        """The session of this cookie, if it is not over; looking for it counts as use."""
        session = self._by_digest.get(digest_of(cookie))
        if session is None:
            return None
        now = self._settings.clock()
        if self._is_over(session, now):
            self.end(cookie)
            return None
        session.seen = now
        return session

    def end(self, cookie: str) -> None:
        self._by_digest.pop(digest_of(cookie), None)

    def _is_over(self, session: Session, now: datetime) -> bool:
        limits = self._settings.limits
        idle = now - session.seen > timedelta(seconds=limits.session_idle_seconds)
        return idle or now - session.began > timedelta(seconds=limits.session_seconds)


def digest_of(cookie: str) -> bytes:
    """Sessions are found by digest: the time a look-up takes then tells nothing about a cookie."""
    return hashlib.sha256(cookie.encode("utf-8", "replace")).digest()
