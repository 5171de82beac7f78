"""Pages that are not a look's sheets: forms, what was understood, problems."""

from __future__ import annotations

from typing import Any

from jinja2 import Environment
from starlette.responses import HTMLResponse

from app.render.page import render_page
from app.sheets.blocks import PageFrame
from app.web.mending import first_at


class Pages:
    """The templates under templates/forms/, rendered."""

    def __init__(self, environment: Environment) -> None:
        self.environment = environment

    def show(
        self, form: str, *, status: int = 200, frame: PageFrame | None = None, base: str = "", **context: Any
    ) -> HTMLResponse:
        """One page; `frame` is the newest look's, on pages for who is inside."""
        page = render_page(
            self.environment, f"forms/{form}.html", frame=frame, base=base, first_at=first_at, **context
        )
        return HTMLResponse(page, status_code=status)
