"""What every route needs, passed by fastapi: the open trial file, who asks, and how pages are made."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated

from fastapi import Depends, Path, Request
from jinja2 import Environment

from app.actions.desk import Desk
from app.settings import Settings
from app.web.gate import Address
from app.web.keys import Keys
from app.web.pages import Pages
from app.web.sessions import Session, Sessions
from app.web.verifying import Verifying

SEE_OTHER = 303
"""After an act the browser is sent on, so that reloading a page repeats nothing."""


@dataclass(frozen=True, eq=False)
class Site:
    """One server: one trial file, two keys, and the sessions that entered with them."""

    settings: Settings
    desk: Desk
    keys: Keys
    address: Address
    sessions: Sessions
    environment: Environment
    pages: Pages
    verifying: Verifying

    @property
    def damage(self) -> str:
        """What was found wrong with the trial file, for the closed side; nothing for a sound one."""
        return "; ".join(map(str, self.desk.trial.damage[: self.settings.limits.findings_shown]))

    def take_clock_doubts(self) -> tuple[str, ...]:
        """What the last acts raise about this machine's clock, once."""
        return tuple(map(str, self.desk.trial.take_clock_doubts()))


async def site_of(request: Request) -> Site:
    site: Site = request.app.state.site
    return site


async def session_of(request: Request) -> Session:
    """The session that the gate found; routes that need none do not ask."""
    session: Session = request.state.session
    return session


TheSite = Annotated[Site, Depends(site_of)]
TheSession = Annotated[Session, Depends(session_of)]
LookNumber = Annotated[int, Path(ge=1, le=9999)]
