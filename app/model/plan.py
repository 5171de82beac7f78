"""The plan: what was fixed before any result was seen. One class a TOML table, one field a key."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from datetime import date
from typing import Literal

Sides = Literal[1, 2]
EventIs = Literal["bad", "good"]


@dataclass(frozen=True)
class Trial:
    name: str
    title: str
    start_date: date | None = None
    planned_end_date: date | None = None


@dataclass(frozen=True)
class Arms:
    """`allocation` is control : experimental; `masked` says how the closed side starts."""

    control: str
    experimental: str
    allocation: tuple[int, int] = (1, 1)
    masked: bool = True

    @property
    def experimental_share(self) -> float:
        """Planned share of subjects in the experimental arm, 0-1."""
        control, experimental = self.allocation
        return experimental / (control + experimental)

    @property
    def unequal(self) -> bool:
        return self.allocation[0] != self.allocation[1]


@dataclass(frozen=True)
class Endpoint:
    parameter: str
    label: str
    event_is: EventIs = "bad"

    @property
    def direction(self) -> Literal[1, -1]:
        """s in z = s(E - O)/sqrt(V): +1 when the event is bad, -1 when it is good."""
        return 1 if self.event_is == "bad" else -1


@dataclass(frozen=True)
class Columns:
    """Names of the columns read; the defaults are ADaM's. None = not read."""

    subject: str = "USUBJID"
    parameter: str = "PARAMCD"
    arm: str = "TRTP"
    time: str = "AVAL"
    censor: str = "CNSR"
    start: str | None = None
    end: str | None = None
    event_text: str | None = None
    adjudicated: str | None = None
    cause: str | None = None
    site: str | None = None
    last_contact: str | None = None
    analysis_set: str | None = None
    strata: tuple[str, ...] = ()


@dataclass(frozen=True)
class Efficacy:
    """A spending function or a fixed family, by its published name, with the keys that family needs."""

    spending: str
    exponent: float | None = None
    parameter: float | None = None
    points: tuple[tuple[float, float], ...] = ()
    shape: float | None = None
    interim_z: float | None = None


@dataclass(frozen=True)
class Design:
    """`alpha` goes with `sides`: one-sided level for 1, two-sided level for 2. Fractions are 0-1."""

    alpha: float
    sides: Sides
    power: float
    hazard_ratio: float
    planned_events: int
    looks: tuple[float, ...]
    information: Literal["events", "score variance"] = "events"
    planned_score_variance: float | None = None  # given exactly where `information` is score variance
    spending_clock: Literal["information", "calendar"] = "information"
    carry_on: Literal["nominal", "crossing"] = "nominal"
    safety_spend: float = 0.0

    @property
    def alpha_one_side(self) -> float:
        """The level of one side: alpha, or half of a two-sided alpha."""
        return self.alpha / self.sides


@dataclass(frozen=True)
class Enrolment:
    planned_subjects: int | None = None
    planned_per_month: float | None = None
    dropout_per_year: float | None = None


@dataclass(frozen=True)
class Futility:
    spending: str | None = None
    parameter: float | None = None
    exponent: float | None = None
    points: tuple[tuple[float, float], ...] = ()
    rule: Literal["conditional power", "hazard ratio"] | None = None
    limit: float | None = None
    binding: bool = False


@dataclass(frozen=True)
class Harm:
    """Harm boundary with its own one-sided alpha; `endpoint_parameter` names another endpoint.

    The events of that endpoint are bad ones, whatever those of the plan's are.
    """

    spending: str
    alpha: float
    endpoint_parameter: str | None = None


@dataclass(frozen=True)
class Analysis:
    ties: Literal["Efron", "Breslow", "exact"] = "Efron"
    curve_interval: Literal["plain", "log", "log-log", "logit", "arcsine-square-root"] = "log-log"
    confidence: float = 0.95
    restricted_mean_at: float | None = None
    landmarks_at: tuple[float, ...] = ()
    weights: tuple[tuple[float, float], ...] = ()
    subgroups: tuple[str, ...] = ()
    prior_hazard_ratio: float | None = None
    prior_std_error: float | None = None


@dataclass(frozen=True)
class Hypothesis:
    """A further endpoint with its own alpha, on the sides of the plan's; `after` names what it waits for."""

    name: str
    parameter: str
    label: str
    event_is: EventIs
    alpha: float
    planned_events: int
    efficacy: Efficacy
    after: str | None = None

    @property
    def endpoint(self) -> Endpoint:
        return Endpoint(self.parameter, self.label, self.event_is)


@dataclass(frozen=True)
class HeldLook:
    number: int
    events: int
    z: float | None
    efficacy_z: float | None
    alpha_spent: float | None
    source: str


@dataclass(frozen=True)
class Plan:
    """A whole plan; `digest` is the SHA-256 (hex) of the bytes it was read from."""

    trial: Trial
    arms: Arms
    endpoint: Endpoint
    columns: Columns
    design: Design
    efficacy: Efficacy
    digest: str
    enrolment: Enrolment = field(default_factory=Enrolment)
    analysis: Analysis = field(default_factory=Analysis)
    futility: Futility | None = None
    harm: Harm | None = None
    hypotheses: tuple[Hypothesis, ...] = ()
    held: tuple[HeldLook, ...] = ()

    @property
    def harm_endpoint(self) -> Endpoint | None:
        """The endpoint of harm, where it is another one than the plan's."""
        named = None if self.harm is None else self.harm.endpoint_parameter
        return None if named in (None, self.endpoint.parameter) else Endpoint(named, named)

    @property
    def harm_endpoint_is_a_hypothesis(self) -> bool:
        harm = self.harm_endpoint
        return harm is not None and harm.parameter in {each.parameter for each in self.hypotheses}

    @property
    def further_endpoints(self) -> tuple[Endpoint, ...]:
        """What an extract must hold beside the plan's endpoint, each parameter once."""
        named = tuple(each.endpoint for each in self.hypotheses)
        harm = self.harm_endpoint
        return named if harm is None or self.harm_endpoint_is_a_hypothesis else (*named, harm)

    def on(self, endpoint: Endpoint) -> Plan:
        """This plan read on another endpoint: arms, columns and analysis as they are."""
        return replace(self, endpoint=endpoint)

    def for_hypothesis(self, hypothesis: Hypothesis) -> Plan:
        """The plan of a further hypothesis: its own endpoint, alpha, planned events and spending.

        Information is its events. Looks held before the file, futility and harm are those of the plan's own
        endpoint; a safety look costs it nothing.
        """
        design = replace(
            self.design,
            alpha=hypothesis.alpha,
            planned_events=hypothesis.planned_events,
            information="events",
            planned_score_variance=None,
            safety_spend=0.0,
        )
        return replace(
            self.on(hypothesis.endpoint),
            design=design,
            efficacy=hypothesis.efficacy,
            futility=None,
            harm=None,
            hypotheses=(),
            held=(),
        )
