"""Every key a plan file may hold, table by table: the model's classes say which are required."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import MISSING, dataclass, field, fields
from typing import Any

from app.intake import domains
from app.intake.domains import Domain, one_of, whole
from app.model import plan

# Each spending function or fixed family by its published name, with the key that it needs.
SPENDING_FUNCTIONS: Mapping[str, str | None] = {
    "O'Brien-Fleming-type": None,
    "Pocock-type": None,
    "power": "exponent",
    "Hwang-Shih-DeCani": "parameter",
    "table": "points",
}
FIXED_FAMILIES: Mapping[str, str | None] = {
    "O'Brien-Fleming": None,
    "Pocock": None,
    "Wang-Tsiatis": "shape",
    "Haybittle-Peto": "interim_z",
}
FAMILIES: Mapping[str, str | None] = {**SPENDING_FUNCTIONS, **FIXED_FAMILIES}


@dataclass(frozen=True)
class Table:
    """One table of the plan file. `noun` is what it becomes; a field without default is a required key."""

    noun: type[Any]
    keys: Mapping[str, Domain]
    required: bool = False
    repeated: bool = False
    optional: frozenset[str] = frozenset()  # keys without default that may be left out: the field is None
    field_names: Mapping[str, str] = field(default_factory=dict)  # key -> field, where they differ
    inner: Mapping[str, Table] = field(default_factory=dict)  # tables written inside this one

    @property
    def known(self) -> tuple[str, ...]:
        return (*self.keys, *self.inner)

    @property
    def required_keys(self) -> tuple[str, ...]:
        bare = {item.name for item in fields(self.noun) if _has_no_default(item)}
        named = (key for key in self.known if self.field_names.get(key, key) in bare)
        return tuple(key for key in named if key not in self.optional)


def _has_no_default(item: Any) -> bool:
    return item.default is MISSING and item.default_factory is MISSING


_EVENT_IS = one_of("bad", "good")
_SPENDING_KEYS = {
    "exponent": domains.POSITIVE,
    "parameter": domains.FINITE,
    "points": domains.POINTS,
}
_EFFICACY = Table(
    plan.Efficacy,
    {
        "spending": one_of(*FAMILIES),
        **_SPENDING_KEYS,
        "shape": domains.SHAPE,
        "interim_z": domains.POSITIVE,
    },
    required=True,
)

TABLES: Mapping[str, Table] = {
    "trial": Table(
        plan.Trial,
        {
            "name": domains.TEXT,
            "title": domains.TEXT,
            "start_date": domains.DAY,
            "planned_end_date": domains.DAY,
        },
        required=True,
    ),
    "arms": Table(
        plan.Arms,
        {
            "control": domains.TEXT,
            "experimental": domains.TEXT,
            "allocation": domains.ALLOCATION,
            "masked": domains.FLAG,
        },
        required=True,
    ),
    "endpoint": Table(
        plan.Endpoint,
        {"parameter": domains.TEXT, "label": domains.TEXT, "event_is": _EVENT_IS},
        required=True,
    ),
    "columns": Table(
        plan.Columns,
        {
            "subject": domains.TEXT,
            "parameter": domains.TEXT,
            "arm": domains.TEXT,
            "time": domains.TEXT,
            "censor": domains.TEXT,
            "start": domains.TEXT,
            "end": domains.TEXT,
            "event_text": domains.TEXT,
            "strata": domains.NAMES,
            "adjudicated": domains.TEXT,
            "cause": domains.TEXT,
            "site": domains.TEXT,
            "last_contact": domains.TEXT,
            "analysis_set": domains.TEXT,
        },
    ),
    "design": Table(
        plan.Design,
        {
            "alpha": domains.LEVEL,
            "sides": domains.SIDES,
            "power": domains.SHARE,
            "hazard_ratio": domains.RATIO,
            "planned_events": whole(1),
            "looks": domains.LOOKS,
            "information": one_of("events", "score variance"),
            "planned_score_variance": domains.VARIANCE,
            "spending_clock": one_of("information", "calendar"),
            "carry_on": one_of("nominal", "crossing"),
            "safety_spend": domains.NOT_NEGATIVE,
        },
        required=True,
    ),
    "efficacy": _EFFICACY,
    "enrolment": Table(
        plan.Enrolment,
        {
            "planned_subjects": whole(2),
            "planned_per_month": domains.POSITIVE,
            "dropout_per_year": domains.NOT_NEGATIVE,
        },
    ),
    "futility": Table(
        plan.Futility,
        {
            "spending": one_of(*SPENDING_FUNCTIONS),
            **_SPENDING_KEYS,
            "rule": one_of("conditional power", "hazard ratio"),
            "limit": domains.POSITIVE,
            "binding": domains.FLAG,
        },
    ),
    "harm": Table(
        plan.Harm,
        {
            "spending": one_of("O'Brien-Fleming-type", "Pocock-type"),
            "alpha": domains.LEVEL,
            "parameter": domains.TEXT,
        },
        field_names={"parameter": "endpoint_parameter"},
    ),
    "analysis": Table(
        plan.Analysis,
        {
            "ties": one_of("Efron", "Breslow", "exact"),
            "curve_interval": one_of("plain", "log", "log-log", "logit", "arcsine-square-root"),
            "confidence": domains.CONFIDENCE,
            "restricted_mean_at": domains.POSITIVE,
            "landmarks_at": domains.TIMES,
            "weights": domains.WEIGHTS,
            "subgroups": domains.NAMES,
            "prior_hazard_ratio": domains.PRIOR,
            "prior_std_error": domains.PRIOR,
        },
    ),
    "hypothesis": Table(
        plan.Hypothesis,
        {
            "name": domains.TEXT,
            "parameter": domains.TEXT,
            "label": domains.TEXT,
            "event_is": _EVENT_IS,
            "after": domains.TEXT,
            "alpha": domains.LEVEL,
            "planned_events": whole(1),
        },
        repeated=True,
        inner={"efficacy": _EFFICACY},
    ),
    "held": Table(
        plan.HeldLook,
        {
            "number": whole(1),
            "events": whole(0),
            "z": domains.Z,
            "efficacy_z": domains.EFFICACY_Z,
            "alpha_spent": domains.SPENT,
            "source": domains.TEXT,
        },
        repeated=True,
        optional=frozenset({"z", "efficacy_z", "alpha_spent"}),
    ),
}
