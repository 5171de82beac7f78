"""The invented trial in a fresh trial file: three looks received, two frozen, the fourth extract at hand."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from dataclasses import replace
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

from app.actions.desk import Desk, UploadedFile
from app.actions.freeze import freeze
from app.actions.receive import Incoming, receive
from app.actions.start import start
from app.assets import asset
from app.settings import Settings

RECORDED_BY = "A. Statistician"
FREEZE_AFTER = timedelta(days=5)


def make_demo(settings: Settings, path: Path) -> None:
    """Make the trial as it would have come about: each act at its own time of the scenario."""
    scenario = tomllib.loads(asset("demo_data", "extracts.toml").read_text(encoding="utf-8"))
    deliveries = [extract for extract in scenario["extract"] if "received_at" in extract]
    plan = asset("demo_data", "plan.toml").read_bytes()
    locked_at = scenario["plan"]["locked_at"]
    start(at(settings, locked_at), plan_name="plan.toml", plan=plan, path=path, by=RECORDED_BY)
    for extract in deliveries:
        _deliver(settings, path, extract)


def at(settings: Settings, moment: datetime) -> Settings:
    """The same settings at a time of the scenario."""
    return replace(settings, clock=lambda: moment)


def _deliver(settings: Settings, path: Path, extract: Mapping[str, Any]) -> None:
    """Receive one extract at its time and, where the scenario says so, freeze its look some days later."""
    file = UploadedFile(extract["file"], asset("demo_data", extract["file"]).read_bytes())
    incoming = Incoming((file,), extract["cutoff"], extract["extracted"], extract["kind"])
    reasons = {each["id"]: each["reason"] for each in extract.get("acknowledgement", ())}
    with Desk.open(at(settings, extract["received_at"]), path) as desk:
        receive(desk, incoming, acknowledgements=reasons, by=extract["by"])
    if extract["frozen"]:
        with Desk.open(at(settings, extract["received_at"] + FREEZE_AFTER), path) as desk:
            freeze(desk, by=extract["by"])
