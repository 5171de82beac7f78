"""The record of how the arms differ beyond one ratio, oriented as the view is."""

from __future__ import annotations

from app.model.survival import LandmarkComparison, RatioOverTime
from app.model.values import Absent
from app.record.numbers import Record, estimate, not_estimable
from app.views.closed import ClosedView


def shape_record(view: ClosedView) -> Record:
    """The names of DESIGN's record for the Shape sheet and the landmarks of the Curves sheet."""
    return {
        "proportionality": _proportionality(view),
        "residuals": _residuals(view),
        "restricted_mean": _restricted_mean(view),
        "weighted": _weighted(view),
        "weighted_maximum": _weighted_maximum(view),
        "landmarks": _landmarks(view),
    }


def _proportionality(view: ClosedView) -> Record:
    test = view.shape.proportionality
    if isinstance(test, Absent):
        return not_estimable(test.reason)
    return {"chi_square": test.chi_square, "p": test.p, "transform": test.transform}


def _residuals(view: ClosedView) -> Record:
    """Each event's scaled residual in the order of time, and the smooth through them."""
    found = view.shape.residuals
    if isinstance(found, Absent):
        return not_estimable(found.reason)
    return {
        "transform": found.transform,
        "time": found.time.tolist(),
        "log_hazard_ratio": found.residuals[:, 0].tolist(),
        "smooth": _smooth(view.shape.ratio_over_time),
    }


def _smooth(ratio: RatioOverTime | Absent) -> Record:
    if isinstance(ratio, Absent):
        return not_estimable(ratio.reason)
    return {
        "time": ratio.time.tolist(),
        "events": ratio.events.tolist(),
        "log_hazard_ratio": ratio.log_hazard_ratio.tolist(),
        "std_error": ratio.std_error.tolist(),
        "hazard_ratio": ratio.hazard_ratio.tolist(),
        "ci_low": ratio.ci_low.tolist(),
        "ci_high": ratio.ci_high.tolist(),
        "level": ratio.level,
    }


def _restricted_mean(view: ClosedView) -> Record | None:
    compared = view.shape.restricted_mean
    if compared is None:
        return None
    if isinstance(compared, Absent):
        return not_estimable(compared.reason)
    means = (compared.experimental, compared.control)
    return {
        "at": compared.at,
        "arms": [
            {"arm": arm.value, "mean": mean.mean, "std_error": mean.std_error}
            for arm, mean in zip(view.arms, means, strict=True)
        ],
        "difference": compared.difference,
        "std_error": compared.std_error,
        "ci_low": compared.ci_low,
        "ci_high": compared.ci_high,
        "level": compared.level,
        "p_two_sided": compared.p_two_sided,
    }


def _weighted(view: ClosedView) -> list[Record] | None:
    if view.shape.weighted is None:
        return None
    weights = zip(view.plan.analysis.weights, view.shape.weighted, strict=True)
    return [
        {
            "rho": rho,
            "gamma": gamma,
            "z": not_estimable(test.reason) if isinstance(test, Absent) else test.z,
            "p_two_sided": not_estimable(test.reason) if isinstance(test, Absent) else test.p_two_sided,
        }
        for (rho, gamma), test in weights
    ]


def _weighted_maximum(view: ClosedView) -> Record | None:
    largest = view.shape.weighted_maximum
    if largest is None:
        return None
    if isinstance(largest, Absent):
        return not_estimable(largest.reason)
    return {"z": largest.z, "p_two_sided": largest.p_two_sided}


def _landmarks(view: ClosedView) -> list[Record] | None:
    if view.shape.landmarks is None:
        return None
    return [_landmark(view, compared) for compared in view.shape.landmarks]


def _landmark(view: ClosedView, compared: LandmarkComparison) -> Record:
    found = (compared.experimental, compared.control)
    return {
        "at": compared.at,
        "arms": [
            {
                "arm": arm.value,
                "survival": estimate(one.survival),
                "ci_low": estimate(one.ci_low),
                "ci_high": estimate(one.ci_high),
            }
            for arm, one in zip(view.arms, found, strict=True)
        ],
        "difference": estimate(compared.difference),
        "ci_low": estimate(compared.ci_low),
        "ci_high": estimate(compared.ci_high),
    }
