"""Check values of what a trial needs before it starts: events, subjects, and its futility and harm bounds."""

from __future__ import annotations

import math
from collections.abc import Callable
from functools import cache

from app.model.boundary import PlannedBoundary
from app.model.plan import Design, Efficacy, Futility, Harm
from app.model.values import Absent, Estimate
from app.sequential.design import planned_boundary
from app.sequential.sample_size import (
    Recruitment,
    expected_events,
    freedman_events,
    lachin_foulkes_subjects,
    schoenfeld_events,
)
from app.validation.rows import Mark, PublishedRow

SCHOENFELD = "Schoenfeld (1981), Biometrika 68; (1983), Biometrics 39"
FREEDMAN = "Freedman (1982), Statistics in Medicine 1"
LACHIN = "Lachin (1981), Controlled Clinical Trials 2; Lachin & Foulkes (1986), Biometrics 42"
NO_PUBLICATION = "none; recursive quadrature of another author, checked by multivariate normal integration"
BY_FORMULA = "none; another author's reading of the formula in {}"

MEMORY: Mark = "value from memory"
REPRODUCED: Mark = "value from memory, reproduced by computation"
COMPUTED: Mark = "computed independently"

# hazard ratio, then events at two-sided 0.05 with power 0.8 and 0.9: Schoenfeld 1:1, Freedman 1:1,
# Schoenfeld 2:1
EVENTS = """
    0.50  65.35  87.48  70.64  94.57  73.51  98.41
    0.60 120.32 161.07 125.58 168.12 135.36 181.20
    0.65 169.18 226.48 174.44 233.52 190.33 254.80
    0.70 246.79 330.38 252.04 337.41 277.64 371.68
    0.75 379.35 507.84 384.60 514.86 426.77 571.32
    0.80 630.52 844.09 635.76 851.10 709.34 949.60
"""
# hazard ratio, power, events by Schoenfeld's formula, 1:1, two-sided 0.05, rounded up
ROUNDED_EVENTS = (
    (0.75, 0.9, "508"),
    (0.7, 0.9, "331"),
    (0.5, 0.8, "66"),
    (0.5, 0.9, "88"),
    (0.8, 0.9, "845"),
)

# hazards 0.3 and 0.2 a year, uniform entry over 3 years, 5 years in all, one-sided 0.05, power 0.9
WITHOUT_DROPOUT = Recruitment(accrual=3.0, total=5.0)
WITH_DROPOUT = Recruitment(accrual=3.0, total=5.0, dropout_hazard=0.05)

# O'Brien-Fleming-type efficacy at one-sided 0.025 and power 0.9, three equal looks, non-binding
# O'Brien-Fleming-type futility
WITH_FUTILITY = (
    ("efficacy bound", "3.7103 2.5114 1.9930"),
    ("futility bound", "-0.6945 1.0025 1.9930"),
)
# O'Brien-Fleming-type efficacy at 0.025 and Pocock-type harm at 0.025, four equal looks
WITH_HARM = (
    ("efficacy bound", "4.3326 2.9631 2.3590 2.0141"),
    ("harm bound", "-2.3683 -2.3675 -2.3582 -2.3500"),
)


def design_rows() -> tuple[PublishedRow, ...]:
    """Every check value of design: events, subjects, futility, harm."""
    return (*_event_rows(), *_rounded_event_rows(), *_subject_rows(), *_futility_rows(), *_harm_rows())


def _event_rows() -> list[PublishedRow]:
    return [row for line in EVENTS.strip().splitlines() for row in _events_at(*line.split())]


def _events_at(ratio: str, *digits: str) -> list[PublishedRow]:
    columns = [
        (name, publication, formula, share, power)
        for name, publication, formula, share in (
            ("Schoenfeld events, 1:1", SCHOENFELD, schoenfeld_events, 1 / 2),
            ("Freedman events, 1:1", FREEDMAN, freedman_events, 1 / 2),
            ("Schoenfeld events, 2:1", SCHOENFELD, schoenfeld_events, 2 / 3),
        )
        for power in (0.8, 0.9)
    ]
    return [
        PublishedRow(
            f"{name}, two-sided 0.05, hazard ratio {ratio}, power {power:g}",
            BY_FORMULA.format(publication),
            COMPUTED,
            expected,
            _events(formula, float(ratio), power, share),
        )
        for (name, publication, formula, share, power), expected in zip(columns, digits, strict=True)
    ]


def _events(formula: Callable[..., float], ratio: float, power: float, share: float) -> Callable[[], float]:
    return lambda: formula(ratio, alpha_one_side=0.025, power=power, experimental_share=share)


def _rounded_event_rows() -> list[PublishedRow]:
    return [
        PublishedRow(
            f"Schoenfeld events, 1:1, two-sided 0.05, hazard ratio {ratio:g}, power {power:g}, rounded up",
            SCHOENFELD,
            REPRODUCED,
            expected,
            _rounded_up(ratio, power),
        )
        for ratio, power, expected in ROUNDED_EVENTS
    ]


def _rounded_up(ratio: float, power: float) -> Callable[[], float]:
    return lambda: math.ceil(schoenfeld_events(ratio, alpha_one_side=0.025, power=power))


def _subject_rows() -> list[PublishedRow]:
    def subjects() -> float:
        return lachin_foulkes_subjects(
            WITHOUT_DROPOUT, control_hazard=0.3, hazard_ratio=2 / 3, alpha_one_side=0.05, power=0.9
        )

    def seen(recruitment: Recruitment, hazard: float) -> Callable[[], float]:
        return lambda: recruitment.event_probability(hazard)

    example = "hazards 0.3 and 0.2, entry over 3 years, 5 in all, one-sided 0.05, power 0.9"
    rows = [
        ("subjects, not rounded", "376.18", subjects),
        ("probability of an event at hazard 0.3", "0.63813", seen(WITHOUT_DROPOUT, 0.3)),
        ("probability of an event at hazard 0.2", "0.49593", seen(WITHOUT_DROPOUT, 0.2)),
        ("probability at hazard 0.3 with drop-out 0.05", "0.59362", seen(WITH_DROPOUT, 0.3)),
        ("probability at hazard 0.2 with drop-out 0.05", "0.45864", seen(WITH_DROPOUT, 0.2)),
        (
            "expected events",
            "213.3",
            lambda: expected_events(subjects(), WITHOUT_DROPOUT, control_hazard=0.3, hazard_ratio=2 / 3),
        ),
    ]
    return [
        PublishedRow(
            f"{example}: subjects in two equal arms",
            LACHIN,
            MEMORY,
            "378",
            lambda: 2.0 * math.ceil(subjects() / 2.0),
        ),
        *(
            PublishedRow(f"{example}: {what}", BY_FORMULA.format(LACHIN), COMPUTED, expected, compute)
            for what, expected, compute in rows
        ),
    ]


@cache
def _with_futility() -> PlannedBoundary:
    design = Design(0.025, 1, 0.9, 0.75, 1000, (1 / 3, 2 / 3, 1.0))
    return planned_boundary(
        design,
        Efficacy("O'Brien-Fleming-type"),
        experimental_share=0.5,
        direction=1,
        futility=Futility("O'Brien-Fleming-type"),
    )


@cache
def _with_harm() -> PlannedBoundary:
    design = Design(0.025, 1, 0.9, 0.75, 1000, (0.25, 0.5, 0.75, 1.0))
    return planned_boundary(
        design,
        Efficacy("O'Brien-Fleming-type"),
        experimental_share=0.5,
        direction=1,
        harm=Harm("Pocock-type", 0.025),
    )


def _futility_rows() -> list[PublishedRow]:
    plan = "non-binding O'Brien-Fleming-type futility, one-sided 0.025, power 0.9, 3 equal looks"
    design = [
        ("noncentrality", "3.33639", lambda: _number(_with_futility().noncentrality)),
        ("inflation", "1.0594", lambda: _number(_with_futility().inflation)),
        (
            "type I error when futility is obeyed",
            "0.02331",
            lambda: sum(chance.efficacy for chance in _with_futility().chances_null),
        ),
        (
            "type I error when futility is ignored",
            "0.0250",
            lambda: _with_futility().bounds[-1].alpha_spent,
        ),
        ("power", "0.9000", lambda: sum(chance.efficacy for chance in _with_futility().chances_design)),
    ]
    return [
        *_bound_rows(plan, WITH_FUTILITY, _with_futility),
        *(_row(f"{plan}: {what}", expected, compute) for what, expected, compute in design),
    ]


def _harm_rows() -> list[PublishedRow]:
    plan = "O'Brien-Fleming-type efficacy and Pocock-type harm, each one-sided 0.025, 4 equal looks"
    return _bound_rows(plan, WITH_HARM, _with_harm)


def _bound_rows(
    plan: str, lines: tuple[tuple[str, str], ...], planned: Callable[[], PlannedBoundary]
) -> list[PublishedRow]:
    return [
        _row(f"{plan}: {name}, look {look}", expected, _bound(planned, name.split()[0], look))
        for name, digits in lines
        for look, expected in enumerate(digits.split(), start=1)
    ]


def _bound(planned: Callable[[], PlannedBoundary], kind: str, look: int) -> Callable[[], float]:
    return lambda: _number(getattr(planned().bounds[look - 1], f"{kind}_z"))


def _row(quantity: str, expected: str, compute: Callable[[], float]) -> PublishedRow:
    return PublishedRow(quantity, NO_PUBLICATION, COMPUTED, expected, compute)


def _number(estimate: Estimate) -> float:
    if isinstance(estimate, Absent):
        raise ValueError(f"a check value exists here, ours does not: {estimate.reason}")
    return estimate
