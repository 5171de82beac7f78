"""Arms as the sheets name them."""

from __future__ import annotations

from app.sheets.blocks import ArmLabel
from app.sheets.words import arm_label
from app.views.closed import ArmView, ClosedView


def label_of(view: ClosedView, arm: ArmView) -> ArmLabel:
    return arm_label(arm.letter, arm.value, masked=view.masked)


def labels(view: ClosedView) -> tuple[ArmLabel, ArmLabel]:
    return label_of(view, view.of), label_of(view, view.against)
