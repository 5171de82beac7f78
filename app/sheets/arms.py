"""Arms as the sheets name them."""

from __future__ import annotations

from dataclasses import replace

from app.sheets.blocks import ArmLabel
from app.sheets.words import arm_label
from app.views.closed import ArmView, ClosedView


def label_of(view: ClosedView, arm: ArmView) -> ArmLabel:
    """By letter, or by name with its letter; where the plan starts unmasked nobody ever saw a letter."""
    label = arm_label(arm.letter, arm.value, masked=view.masked)
    if view.plan.arms.masked or view.masked:
        return label
    return replace(label, name=f"{label.in_sentence[:1].upper()}{label.in_sentence[1:]}")


def labels(view: ClosedView) -> tuple[ArmLabel, ArmLabel]:
    return label_of(view, view.of), label_of(view, view.against)
