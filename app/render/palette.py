"""The colours that exist. Ink is earned: colour carries an arm, a doubt, a crossed boundary, nothing else."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from app.sheets.blocks import ArmLabel

PAPER = "#FFFFFF"
INK = "#1A1A1E"
INK_2 = "#54545A"  # secondary text, past columns
INK_3 = "#707076"  # axes and edges; never text
HAIRLINE = "#C8C8CC"
GRID = "#E4E4E6"

CROSSED = "#7A1128"
CROSSED_ZONE = "#E9D3D7"
ZONE_PAST = "#E4E4E2"
ZONE_NOW = "#CFCFCD"
ZONE_PLANNED = "#EEEEEC"
HATCH_PAST = "#B4B4B8"
HATCH_NOW = INK_3

MANY_MARKS = HATCH_PAST  # marks of events so many that darker ones would hide the line through them
BAND = ZONE_PLANNED  # limits of what belongs to no arm; the grid still shows on it

BAND_OPACITY = 0.09  # at 0.12 arm B's line fell below 3:1 where the bands overlap


@dataclass(frozen=True)
class ArmInk:
    """How an arm is drawn: its line, its words; a hollow line is told apart without colour."""

    line: str
    text: str
    hollow: bool


ARM_A = ArmInk("#0072B2", "#005A8C", hollow=False)
ARM_B = ArmInk("#D55E00", "#A34700", hollow=True)
POOLED = ArmInk(INK, INK, hollow=False)


def arm_ink(arm: ArmLabel | None) -> ArmInk:
    """Ink belongs to the letter, that is to the patients, and survives unmasking."""
    if arm is None:
        return POOLED
    return ARM_A if arm.letter == "A" else ARM_B


LaneState = Literal["past", "now", "planned"]

EFFICACY_ZONE: dict[LaneState, str] = {"past": ZONE_PAST, "now": ZONE_NOW, "planned": ZONE_PLANNED}
HATCH: dict[LaneState, str] = {"past": HATCH_PAST, "now": HATCH_NOW, "planned": HATCH_PAST}
