"""Pages that are not a look's sheets: forms, what was understood, problems."""

from __future__ import annotations

from typing import Any

from jinja2 import Environment
from starlette.responses import HTMLResponse


class Pages:
    """The templates under templates/forms/, rendered."""

    def __init__(self, environment: Environment) -> None:
        self.environment = environment

    def show(self, name: str, *, status: int = 200, **context: Any) -> HTMLResponse:
        page = self.environment.get_template(f"forms/{name}.html").render(**context)
        return HTMLResponse(page, status_code=status)
