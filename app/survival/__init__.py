"""Survival estimators: arrays in, frozen records out; numpy and scipy only."""

from app.survival.comparison import logrank, logrank_of, logrank_steps, two_arm_events, two_arm_table
from app.survival.cox import cox_two_arms, cox_two_arms_of
from app.survival.curve import follow_up_median, kaplan_meier, kaplan_meier_by_arm
from app.survival.near_ties import merge_near_ties
from app.survival.risk_table import EventTable, RiskTable, event_table, risk_table

__all__ = [
    "EventTable",
    "RiskTable",
    "cox_two_arms",
    "cox_two_arms_of",
    "event_table",
    "follow_up_median",
    "kaplan_meier",
    "kaplan_meier_by_arm",
    "logrank",
    "logrank_of",
    "logrank_steps",
    "merge_near_ties",
    "risk_table",
    "two_arm_events",
    "two_arm_table",
]
