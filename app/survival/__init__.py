"""Survival estimators: arrays in, frozen records out; numpy and scipy only."""

from app.survival.comparison import logrank, logrank_of, logrank_steps, two_arm_events, two_arm_table
from app.survival.cox import cox_two_arms, cox_two_arms_of
from app.survival.cox_regression import baseline_hazard, cox_regression
from app.survival.cumulative_hazard import nelson_aalen
from app.survival.curve import follow_up_median, kaplan_meier, kaplan_meier_by_arm
from app.survival.effect_pieces import interaction, period_ratios
from app.survival.follow_up import completeness
from app.survival.gray import gray_test
from app.survival.incidence import cause_specific_ratio, cumulative_incidence
from app.survival.landmarks import compare_landmarks
from app.survival.many_groups import groups_logrank, trend_logrank
from app.survival.near_ties import merge_near_ties
from app.survival.permutation import permutation_logrank
from app.survival.proportionality import (
    hazard_ratio_over_time,
    proportionality,
    proportionality_tests,
    scaled_residuals,
)
from app.survival.readings import counts_at, landmark, log_log_curve, quantile
from app.survival.restricted_mean import (
    compare_restricted_means,
    largest_common_time,
    restricted_mean,
)
from app.survival.risk_table import EventTable, RiskTable, event_table, risk_table
from app.survival.simple_ratios import peto_one_step, pike_ratio
from app.survival.weighted import (
    weighted_logrank,
    weighted_logrank_of,
    weighted_maximum,
    weighted_maximum_of,
)
from app.survival.weights import (
    GEHAN_BRESLOW,
    LOG_RANK,
    MODIFIED_PETO_PETO,
    PETO_PETO,
    TARONE_WARE,
    Weight,
    fleming_harrington,
)

__all__ = [
    "GEHAN_BRESLOW",
    "LOG_RANK",
    "MODIFIED_PETO_PETO",
    "PETO_PETO",
    "TARONE_WARE",
    "EventTable",
    "RiskTable",
    "Weight",
    "baseline_hazard",
    "cause_specific_ratio",
    "compare_landmarks",
    "compare_restricted_means",
    "completeness",
    "counts_at",
    "cox_regression",
    "cox_two_arms",
    "cox_two_arms_of",
    "cumulative_incidence",
    "event_table",
    "fleming_harrington",
    "follow_up_median",
    "gray_test",
    "groups_logrank",
    "hazard_ratio_over_time",
    "interaction",
    "kaplan_meier",
    "kaplan_meier_by_arm",
    "landmark",
    "largest_common_time",
    "log_log_curve",
    "logrank",
    "logrank_of",
    "logrank_steps",
    "merge_near_ties",
    "nelson_aalen",
    "period_ratios",
    "permutation_logrank",
    "peto_one_step",
    "pike_ratio",
    "proportionality",
    "proportionality_tests",
    "quantile",
    "restricted_mean",
    "risk_table",
    "scaled_residuals",
    "trend_logrank",
    "two_arm_events",
    "two_arm_table",
    "weighted_logrank",
    "weighted_logrank_of",
    "weighted_maximum",
    "weighted_maximum_of",
]
