"""Survival estimators: arrays in, frozen records out; numpy and scipy only."""

from app.survival.comparison import logrank, logrank_of, two_arm_table
from app.survival.cox import cox_two_arms, cox_two_arms_of
from app.survival.curve import follow_up_median, kaplan_meier
from app.survival.near_ties import merge_near_ties
from app.survival.risk_table import RiskTable, risk_table

__all__ = [
    "RiskTable",
    "cox_two_arms",
    "cox_two_arms_of",
    "follow_up_median",
    "kaplan_meier",
    "logrank",
    "logrank_of",
    "merge_near_ties",
    "risk_table",
    "two_arm_table",
]
