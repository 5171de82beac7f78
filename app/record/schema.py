"""The names of a record, fixed for ever, and a check that a record keeps to them.

A shape is a Python value: a type or tuple of types for a leaf, a dict for an object with exactly these keys,
a one-element list for a list. `Maybe(shape)` may also be null (not asked), `Estimable(shape)` may also be
`{"not_estimable": reason}`, and `Later(shape)` may be lacking in a record that was frozen before it came. NaN
and infinities are no numbers of a record.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

FORMAT = 1


@dataclass(frozen=True)
class Maybe:
    shape: Any


@dataclass(frozen=True)
class Estimable:
    shape: Any


@dataclass(frozen=True)
class Later:
    """A name that came after records had been frozen: theirs may lack it."""

    shape: Any


NUMBER = (int, float)
ESTIMATE = Estimable(NUMBER)

FINDING = {
    "id": str, "severity": str, "what": str, "where": str, "found": str, "accepted": str, "remedy": str,
    "rows": [int], "count": int,
}  # fmt: skip
LOGRANK = {
    "observed": NUMBER, "expected": NUMBER, "variance": NUMBER, "z": NUMBER, "chi_square": NUMBER,
    "p_one_sided": Maybe(NUMBER), "p_two_sided": NUMBER,
    "strata": [{"label": str, "subjects": int, "events": int, "observed": NUMBER, "expected": NUMBER,
                "variance": NUMBER}],
}  # fmt: skip
COX = {
    "log_hazard_ratio": NUMBER, "std_error": NUMBER, "hazard_ratio": NUMBER,
    "ci_low": NUMBER, "ci_high": NUMBER, "level": NUMBER, "ties": str,
}  # fmt: skip
CURVE = {
    "arm": str, "time": [NUMBER], "at_risk": [int], "events": [int], "censored": [int], "survival": [NUMBER],
    "std_error": [ESTIMATE], "ci_low": [ESTIMATE], "ci_high": [ESTIMATE], "interval": str, "level": NUMBER,
    "median": ESTIMATE, "median_ci_low": ESTIMATE, "median_ci_high": ESTIMATE, "follow_up_median": ESTIMATE,
}  # fmt: skip
BOUND = {
    "number": int, "information_fraction": NUMBER, "events": int, "final": bool, "sides": int,
    "alpha_spent": NUMBER, "alpha_spent_here": NUMBER, "efficacy_z": ESTIMATE,
    "efficacy_p_one_sided": ESTIMATE, "efficacy_hazard_ratio": ESTIMATE, "efficacy_b_value": ESTIMATE,
    "futility_z": Maybe(ESTIMATE), "type_two_spent": Maybe(NUMBER), "futility_hazard_ratio": Maybe(ESTIMATE),
    "harm_z": Maybe(ESTIMATE), "harm_alpha_spent": Maybe(NUMBER), "harm_hazard_ratio": Maybe(ESTIMATE),
}  # fmt: skip
CONDITIONAL_POWER = {
    "hazard_ratio": ESTIMATE, "final_look": ESTIMATE, "path": ESTIMATE,
    "path_futility_obeyed": Maybe(ESTIMATE),
}  # fmt: skip
NEXT_LOOK = {
    "number": int, "information_fraction": NUMBER, "events": int, "efficacy_z": ESTIMATE,
    "efficacy_hazard_ratio": ESTIMATE, "futility_z": Maybe(ESTIMATE), "new_events_z": ESTIMATE,
    "new_events_hazard_ratio": ESTIMATE, "chance": {"design": ESTIMATE, "trend": ESTIMATE, "null": ESTIMATE},
}  # fmt: skip
EFFECTS = ("design", "trend", "trend_low", "trend_high", "null")
OUTLOOK: dict[str, Any] = {
    "conditional_power": dict.fromkeys(EFFECTS, CONDITIONAL_POWER), "criterion": ESTIMATE,
    "predictive_power": {"flat": ESTIMATE, "prior": Maybe(ESTIMATE)}, "next_look": Maybe(NEXT_LOOK),
}  # fmt: skip
REPEATED_INTERVAL = {"ci_low": ESTIMATE, "ci_high": ESTIMATE, "level": NUMBER}
STOPPING = {
    "p_one_sided": ESTIMATE, "median_unbiased_hazard_ratio": ESTIMATE, "ci_low": ESTIMATE,
    "ci_high": ESTIMATE, "level": NUMBER,
}  # fmt: skip
ONWARDS = {"outlook": Maybe(Estimable(OUTLOOK)), "stopping": Maybe(Estimable(STOPPING))}
"""Masked these depend on the reading and stand there; ratios in them are experimental / control."""
CROSSING = {"crossed": Maybe(str), "first_crossed": Maybe(int), "waits_for": Later(Maybe(str))}
READING = {
    "experimental": str, "z": ESTIMATE, "p_one_sided": ESTIMATE, "z_for_harm": Later(Maybe(NUMBER)),
    **CROSSING, **ONWARDS,
}  # fmt: skip
HISTORY = {
    "number": int, "kind": str, "information": NUMBER, "events": int, "fraction": NUMBER, "z": Maybe(NUMBER),
    "efficacy_z": ESTIMATE, "efficacy_hazard_ratio": ESTIMATE, "alpha_spent": NUMBER, "final": bool,
    "crossed": Maybe(str), "futility_z": Maybe(ESTIMATE), "harm_z": Maybe(ESTIMATE),
    "z_for_harm": Later(Maybe(NUMBER)),
}  # fmt: skip
HELD = {
    "number": int, "events": int, "source": str, "z": Maybe(NUMBER), "efficacy_z": Maybe(NUMBER),
    "computed_efficacy_z": ESTIMATE, "difference": Maybe(ESTIMATE), "alpha_spent": NUMBER,
    "computed_alpha_spent": NUMBER, "alpha_difference": NUMBER,
}  # fmt: skip
INFORMATION = {
    "subjects": int, "events": int, "fraction": NUMBER, "planned_events": int, "planned_subjects": Maybe(int),
    "score_variance": ESTIMATE, "variance_ratio": ESTIMATE,
    "arms": [{"arm": str, "subjects": int, "events": int, "person_time": NUMBER,
              "follow_up_median": ESTIMATE}],
    "strata": [{"label": str, "subjects": int, "events": int,
                "arms": [{"arm": str, "subjects": int, "events": int}]}],
}  # fmt: skip
CHANGES = {
    "subjects_in_both": int, "new_subjects": int, "vanished_subjects": int, "new_events": int,
    "reversed_events": int, "moved_events": int, "changed_arm": int, "changed_stratum": int,
    "new_subjects_with_event": int, "vanished_with_event": int,
}  # fmt: skip
PROPORTIONALITY = {"chi_square": NUMBER, "p": NUMBER, "transform": str}
RATIO_OVER_TIME = {
    "time": [NUMBER], "events": [int], "log_hazard_ratio": [NUMBER], "std_error": [NUMBER],
    "hazard_ratio": [NUMBER], "ci_low": [NUMBER], "ci_high": [NUMBER], "level": NUMBER,
}  # fmt: skip
RESIDUALS = {
    "transform": str, "time": [NUMBER], "log_hazard_ratio": [NUMBER], "smooth": Estimable(RATIO_OVER_TIME),
}  # fmt: skip
RESTRICTED_MEAN = {
    "at": NUMBER, "arms": [{"arm": str, "mean": NUMBER, "std_error": NUMBER}], "difference": NUMBER,
    "std_error": NUMBER, "ci_low": NUMBER, "ci_high": NUMBER, "level": NUMBER, "p_two_sided": NUMBER,
}  # fmt: skip
WEIGHTED = {"rho": NUMBER, "gamma": NUMBER, "z": ESTIMATE, "p_two_sided": ESTIMATE}
WEIGHTED_MAXIMUM = {"z": NUMBER, "p_two_sided": NUMBER}
LANDMARK = {
    "at": NUMBER, "arms": [{"arm": str, "survival": ESTIMATE, "ci_low": ESTIMATE, "ci_high": ESTIMATE}],
    "difference": ESTIMATE, "ci_low": ESTIMATE, "ci_high": ESTIMATE,
}  # fmt: skip
HARM_ENDPOINT = {
    "parameter": str, "information": NUMBER,
    "arms": [{"arm": str, "subjects": int, "events": int, "person_time": NUMBER,
              "follow_up_median": ESTIMATE}],
    "logrank": Estimable(LOGRANK), "cox": Estimable(COX),
}  # fmt: skip
ENDPOINT_AT_LOOK = {
    "number": int, "kind": str, "final": bool, "time_unit": str,
    "cutoff": Maybe(str), "extracted": Maybe(str),
    "information": INFORMATION, "changes": Maybe(CHANGES),
    "calendar": Maybe({"day": [int], "randomised": [int], "events": [int]}),
    "logrank": Estimable(LOGRANK), "logrank_unstratified": Estimable(LOGRANK),
    "cox": Estimable(COX), "cox_unstratified": Estimable(COX),
    "curves": [CURVE], "boundary": {**BOUND, "information": NUMBER, **CROSSING}, "readings": Maybe([READING]),
    "history": [HISTORY], "ahead": [BOUND], **ONWARDS,
    "repeated_interval": Maybe(Estimable(REPEATED_INTERVAL)), "proportionality": Estimable(PROPORTIONALITY),
    "residuals": Later(Estimable(RESIDUALS)),
    "restricted_mean": Maybe(Estimable(RESTRICTED_MEAN)), "weighted": Maybe([WEIGHTED]),
    "weighted_maximum": Maybe(Estimable(WEIGHTED_MAXIMUM)), "landmarks": Maybe([LANDMARK]),
}  # fmt: skip
HYPOTHESIS = {
    "name": str, "parameter": str, "label": str, "event_is": str, "after": Maybe(str), "alpha": NUMBER,
}  # fmt: skip
LOOK = {
    **ENDPOINT_AT_LOOK, "harm_endpoint": Later(Maybe(HARM_ENDPOINT)),
    "hypotheses": Maybe([{**HYPOTHESIS, **ENDPOINT_AT_LOOK}]), "alpha_of_all": Later(NUMBER),
}  # fmt: skip
ENVELOPE = {
    "format": int, "kind": str, "program": {"name": str, "version": str}, "plan_digest": str,
    "snapshot_digests": [str], "orientation": Maybe({"of": str, "against": str}), "run_at": str,
    "findings": [FINDING],
}  # fmt: skip
LOOKS_RECORD = {**ENVELOPE, "held": Maybe([HELD]), "looks": [LOOK]}
"""What a trial file keeps and a report carries. It has no name for what somebody only asked about."""
POWERS_ASKED = {**OUTLOOK["conditional_power"], "chosen": Maybe(Estimable(CONDITIONAL_POWER))}
LOOK_ASKED = {**LOOK, "outlook": Maybe(Estimable({**OUTLOOK, "conditional_power": POWERS_ASKED}))}
EVALUATION_RECORD = {**LOOKS_RECORD, "looks": [LOOK_ASKED]}
"""What `evaluate` prints and nobody keeps: conditional power also under a `chosen` hazard ratio."""
CHANCE = {
    "number": int, "efficacy": NUMBER, "futility": NUMBER, "harm": NUMBER, "control": NUMBER,
}  # fmt: skip
HYPOTHESIS_BOUNDS = {**HYPOTHESIS, "planned_events": int, "looks": [BOUND]}
BOUNDARY_RECORD = {
    **ENVELOPE, "hypotheses": Maybe([HYPOTHESIS_BOUNDS]), "alpha_of_all": NUMBER,
    "sides": int, "looks": [BOUND], "noncentrality": ESTIMATE, "power": NUMBER,
    "inflation": ESTIMATE,
    "expected_information_fraction": {"null": ESTIMATE, "half": ESTIMATE, "design": ESTIMATE},
    "crossing_probability": {"null": [CHANCE], "half": [CHANCE], "design": [CHANCE]},
    "power_reached": NUMBER, "events_needed": int,
    "fixed_design_events": {"schoenfeld": NUMBER, "freedman": NUMBER},
}  # fmt: skip


def differences(record: Any, shape: Any, where: str = "record") -> Iterator[str]:
    """Every place where `record` does not keep to `shape`, in words; nothing when it does."""
    if isinstance(shape, Later):
        yield from differences(record, shape.shape, where)
    elif isinstance(shape, Maybe):
        if record is not None:
            yield from differences(record, shape.shape, where)
    elif isinstance(shape, Estimable):
        if isinstance(record, dict) and record.keys() == {"not_estimable"}:
            yield from _reason_differences(record["not_estimable"], where)
        else:
            yield from differences(record, shape.shape, where)
    elif isinstance(shape, dict):
        yield from _object_differences(record, shape, where)
    elif isinstance(shape, list):
        if isinstance(record, list):
            for index, item in enumerate(record):
                yield from differences(item, shape[0], f"{where}[{index}]")
        else:
            yield f"{where}: {type(record).__name__} where a list belongs"
    elif not _is_leaf(record, shape):
        yield f"{where}: {record!r} is not of the kind recorded there"


def _reason_differences(reason: Any, where: str) -> Iterator[str]:
    if not (isinstance(reason, str) and reason):
        yield f"{where}: not_estimable without a reason"


def _object_differences(record: Any, shape: dict[str, Any], where: str) -> Iterator[str]:
    if not isinstance(record, dict):
        yield f"{where}: {type(record).__name__} where an object belongs"
        return
    yield from (f"{where}.{key}: not a name of the record" for key in record.keys() - shape.keys())
    for key, part in shape.items():
        if isinstance(part, Later) and key not in record:
            continue
        if key in record:
            yield from differences(record[key], part, f"{where}.{key}")
        else:
            yield f"{where}.{key}: missing"


def _is_leaf(value: Any, shape: Any) -> bool:
    kinds = shape if isinstance(shape, tuple) else (shape,)
    finite = not isinstance(value, float) or math.isfinite(value)
    return isinstance(value, kinds) and finite and (bool in kinds or not isinstance(value, bool))
