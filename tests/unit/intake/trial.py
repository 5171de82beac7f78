"""A small invented trial whose rows the tests of this folder change one value at a time."""

from __future__ import annotations

from datetime import date, timedelta

from app.intake.extract import read_extract, received_file
from app.intake.plan import read_plan
from app.model.extract import Extract, ReceivedFile
from app.model.plan import Plan
from app.settings import Limits

CUTOFF = date(2025, 6, 30)
Row = dict[str, str]

PLAN = """\
format = 1
[trial]
name = "T1"
title = "A small invented trial"
[arms]
control = "PLACEBO"
experimental = "TABLET"
[endpoint]
parameter = "DEATH"
label = "Death from any cause"
[columns]
COLUMNS
[design]
alpha = 0.025
sides = 1
power = 0.9
hazard_ratio = 0.6
planned_events = 165
looks = [1.0]
[efficacy]
spending = "O'Brien-Fleming-type"
"""


def plan(columns: str = 'strata = ["REGION"]') -> Plan:
    return read_plan(PLAN.replace("COLUMNS", columns).encode(), name="plan.toml", limits=Limits())


def rows(count: int = 12) -> list[Row]:
    """Starts five days apart; every other subject has an event, the later the later the start."""
    listed = []
    for at in range(count):
        start, event = date(2024, 1, 10) + timedelta(days=5 * at), at % 2 == 0
        end = start + timedelta(days=60 + 9 * at) if event else CUTOFF
        listed.append(
            {
                "STUDYID": "T1",
                "USUBJID": f"T1-{at + 1:03d}",
                "TRTP": ("PLACEBO", "TABLET")[at // 2 % 2],
                "PARAMCD": "DEATH",
                "AVAL": str((end - start).days + 1),
                "CNSR": "0" if event else "1",
                "EVNTDESC": "Death" if event else "Alive at data cutoff",
                "STARTDT": start.isoformat(),
                "ADT": end.isoformat(),
                "REGION": ("North", "South")[at // 4 % 2],
            }
        )
    return listed


def without(columns: str, listed: list[Row]) -> list[Row]:
    return [{name: value for name, value in row.items() if name not in columns.split()} for row in listed]


def text_of(listed: list[Row]) -> str:
    return "\n".join([",".join(listed[0]), *(",".join(row.values()) for row in listed)]) + "\n"


def file_of(listed: list[Row], name: str = "adtte.csv") -> ReceivedFile:
    return received_file(name, text_of(listed).encode())


def read(*files: ReceivedFile, under: Plan | None = None, cutoff: date | None = CUTOFF) -> Extract:
    return read_extract(files, under or plan(), cutoff=cutoff, limits=Limits())


def ids(extract: Extract) -> list[str]:
    return [finding.id for finding in extract.findings]
