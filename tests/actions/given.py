"""What a person gives: the demo's plan with keys changed, and its extracts."""

from __future__ import annotations

from dataclasses import replace
from datetime import date
from pathlib import Path

from app.actions.desk import Desk, UploadedFile
from app.actions.freeze import freeze
from app.actions.receive import Incoming, receive
from app.actions.start import start
from app.assets import asset
from app.settings import Settings

PLAN = asset("demo_data", "plan.toml").read_bytes()
BY = "Jane Roe"
FOURTH = Incoming(
    (UploadedFile("extract-4.csv", asset("demo_data", "extract-4.csv").read_bytes()),),
    date(2026, 10, 9),
    date(2026, 10, 23),
    "planned",
)
BLOCKED = replace(
    FOURTH,
    files=(UploadedFile("extract-4.csv", FOURTH.files[0].content.replace(b"PLACEBO", b"PLACEBOS", 1)),),
)
REASON_OF_SECOND = {"time-disagrees-with-dates": "Digits exchanged in one censored time"}
REASONS = {
    "time-zero": "Randomised on the day of the cutoff",
    "time-disagrees-with-dates": "The data centre confirmed the dates",
    "study-differs": "Digits exchanged in the study's name",
}


def plan_with(*changes: tuple[bytes, bytes]) -> bytes:
    """The demo's plan with each text replaced, once."""
    plan = PLAN
    for before, after in changes:
        assert plan.count(before) == 1
        plan = plan.replace(before, after)
    return plan


SECOND = Incoming(
    (UploadedFile("extract-2.csv", asset("demo_data", "extract-2.csv").read_bytes()),),
    date(2025, 4, 1),
    date(2025, 4, 15),
    "planned",
)
HELD_BEFORE = b"""[[held]]
number = 1
events = 135
z = 0.9
efficacy_z = 4.333
alpha_spent = 0.00001
source = "Charter table 2"
[efficacy]
"""


def start_after_a_held_look(settings: Settings, path: Path) -> None:
    """The demo's trial, its first look held before the file; the second is received and open."""
    plan = plan_with((b"[efficacy]\n", HELD_BEFORE))
    start(settings, plan_name="plan.toml", plan=plan, path=path, by=BY)
    with Desk.open(settings, path) as desk:
        receive(desk, SECOND, acknowledgements=REASON_OF_SECOND, by=BY)


def revised_plan() -> bytes:
    """More events planned, another spending function, other looks."""
    return plan_with(
        (b"planned_events = 538", b"planned_events = 600"),
        (b'spending = "O\'Brien-Fleming-type"', b'spending = "Pocock-type"'),
        (b"looks = [0.25, 0.5, 0.75, 1.0]", b"looks = [0.3, 0.55, 0.8, 1.0]"),
    )


def freeze_and_receive_the_fourth(desk: Desk) -> int:
    freeze(desk, by=BY)
    return receive_the_fourth(desk)


def receive_the_fourth(desk: Desk) -> int:
    return receive(desk, FOURTH, acknowledgements=REASONS, by=BY)
