"""The demo's trial file behind the real application, spoken to as a browser speaks."""

from __future__ import annotations

import shutil
import time
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from fastapi.testclient import TestClient

from app.actions.desk import Desk
from app.assets import asset
from app.settings import Limits, Settings
from app.web.application import Application, create_app
from app.web.gate import Address
from app.web.keys import Keys, Side

ADDRESS = Address(8123)
OWN = {"Origin": ADDRESS.url}
TODAY = datetime(2026, 11, 2, 9, 30, tzinfo=UTC)
KEYS = Keys(closed="the-closed-key", open="the-open-key")

FOURTH = "extract-4.csv"
FOURTH_ANSWERS = {"cutoff": "2026-10-09", "extracted": "2026-10-23", "kind": "final"}


@dataclass
class Served:
    """One trial file and a browser that has not entered yet."""

    path: Path
    desk: Desk
    app: Application
    client: TestClient

    def enter(self, side: Side = "closed") -> None:
        """Come in as a person does, which opens the newest look."""
        key = KEYS.closed if side == "closed" else KEYS.open
        assert self.post("/enter", key=key).status_code == 303
        newest = self.get("/").headers.get("location")
        if newest:
            self.get(newest)

    def get(self, path: str, **options: Any) -> Any:
        return self.client.get(path, follow_redirects=False, **options)

    def post(self, path: str, **fields: str) -> Any:
        return self.client.post(path, data=fields, headers=OWN, follow_redirects=False)

    def verification(self, response: Any = None) -> Any:
        """The page that a verification ends with, followed as a browser follows it."""
        response = response or self.get("/closed/verify")
        until = time.monotonic() + 120
        while response.status_code == 303 or 'http-equiv="refresh"' in response.text:
            assert time.monotonic() < until
            response = self.get("/closed/verify/running")
        return response

    def upload(self, content: bytes, name: str = FOURTH, **answers: str) -> Any:
        return self.client.post(
            "/closed/receive",
            data={**FOURTH_ANSWERS, **answers},
            files=[("files", (name, content, "text/csv"))],
            headers=OWN,
            follow_redirects=False,
        )


def serve_copy(original: Path, folder: Path, *, limits: Limits | None = None) -> Served:
    """The application over its own copy of a trial file."""
    path = Path(shutil.copy(original, folder / "Q17.trial"))
    settings = Settings(clock=lambda: TODAY, limits=limits or Limits())
    desk = Desk.open(settings, path)
    app = create_app(settings, desk, KEYS, port=ADDRESS.port)
    client = TestClient(app, base_url=ADDRESS.url, raise_server_exceptions=False)
    return Served(path, desk, app, client)


def fourth_extract() -> bytes:
    return asset("demo_data", FOURTH).read_bytes()
