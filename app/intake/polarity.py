"""Does 0 mean an event? ADaM says so; many files say the opposite, and the curves would not show it."""

from __future__ import annotations

import re
from collections.abc import Iterator
from datetime import date

import numpy as np

from app.intake import readings
from app.intake.csv_table import TextColumn
from app.intake.findings import finding, quoted
from app.intake.rows import EndpointRows
from app.model.extract import Finding
from app.model.plan import Endpoint
from app.model.values import Bools, Floats

LEAST_ROWS_AT_CUTOFF = 5
LEAST_ROWS_TO_ORDER = 10
LATER_IS_SUSPICIOUS = 0.75

_CENSORED = re.compile(
    r"\b(censor\w*|event[- ]?free|(no|without|did not have) (an? )?event|alive|lost to follow\w*|ongoing"
    r"|(data |study )?cut[- ]?off|end of (study|follow[- ]?up)|last (contact|visit)|study complet\w*"
    r"|completed (the )?study)\b",
    re.IGNORECASE,
)
_NEGATION = re.compile(r"\b(no|not|without|free|never)\b", re.IGNORECASE)
_COMMON = frozenset(
    {"time", "from", "until", "with", "without", "first", "last", "event", "events", "cause", "days", "date"}
)
_ACCEPTED = "0 for an event, whole numbers above 0 for censored follow-up (ADaM)"
_REMEDY = "have the data centre turn the values, or name the right column in the plan"


def polarity(endpoint: EndpointRows, plan: Endpoint, cutoff: date | None) -> Iterator[Finding]:
    """What the texts say of CNSR; where they say nothing, what dates and times suggest."""
    told = list(_by_text(endpoint, plan))
    yield from told or list(_by_cutoff(endpoint, cutoff)) or _by_order(endpoint)


def _by_text(endpoint: EndpointRows, plan: Endpoint) -> Iterator[Finding]:
    """Blocks when the descriptions contradict CNSR wholesale; doubts single rows that do.

    Words of the endpoint under a censored row tell less than words of censoring under an event (`In hospital`
    may describe who waits for a discharge from hospital): alone they block only where events have no words.
    """
    texts = endpoint.rows.parts.get("event_text")
    if texts is None:
        return
    told_censored = texts.where(lambda text: _tells_censored(text, plan))
    told_event = texts.where(lambda text: _tells_event(text, plan)) & ~told_censored
    event, censored = endpoint.event, endpoint.censor > 0
    censored_as_event = _share(told_censored, event) > 0.5 > _share(told_censored, censored)
    event_as_censored = _share(told_event, censored) > 0.5 > _share(told_event, event)
    if censored_as_event:
        yield from _exchanged(endpoint, told_censored & event, texts, blocks=True)
    elif event_as_censored:
        events_unnamed = _share(texts.where(readings.is_blank), event) > 0.5
        yield from _exchanged(endpoint, told_event & censored, texts, blocks=events_unnamed)
    else:
        yield from _contradicted(endpoint, told_censored & event, texts)


def _exchanged(endpoint: EndpointRows, at: Bools, texts: TextColumn, *, blocks: bool) -> Iterator[Finding]:
    return endpoint.rows.findings(
        at,
        "censor-inverted" if blocks else "censor-suspicious",
        "block" if blocks else "doubt",
        "events and censored follow-up look exchanged",
        endpoint.rows.choice.parts["censor"],
        accepted=_ACCEPTED,
        remedy=_REMEDY,
        value=lambda row: f"{endpoint.censor[row]}, described as {quoted(texts.at(row))}",
    )


def _contradicted(endpoint: EndpointRows, at: Bools, texts: TextColumn) -> Iterator[Finding]:
    return endpoint.rows.findings(
        at,
        "censor-contradicted",
        "doubt",
        "an event described as censored",
        endpoint.rows.choice.parts["censor"],
        accepted=_ACCEPTED,
        remedy="the row counts as an event; ask the data centre which is right",
        value=lambda row: f"0, described as {quoted(texts.at(row))}",
    )


def _tells_censored(text: str, plan: Endpoint) -> bool:
    """Where the event is good, `alive` may describe it (discharged alive) and tells nothing."""
    if plan.event_is == "good":
        text = re.sub(r"\balive\b", "", text, flags=re.IGNORECASE)
    return bool(_CENSORED.search(text))


def _tells_event(text: str, plan: Endpoint) -> bool:
    """A word of the endpoint's label, not denied: `Death` under `Death or heart-failure admission`."""
    words = set(re.findall(r"[a-z]{4,}", text.lower()))
    return bool(words & (set(re.findall(r"[a-z]{4,}", plan.label.lower())) - _COMMON)) and not (
        _NEGATION.search(text)
    )


def _share(told: Bools, among: Bools) -> float:
    """Share of `told` among the rows `among`, 0 where there are none."""
    return float(told[among].mean()) if among.any() else 0.0


def _by_cutoff(endpoint: EndpointRows, cutoff: date | None) -> Iterator[Finding]:
    """Follow-up that runs to the cutoff, or to the last day there is, ends without an event as a rule."""
    if endpoint.end is None or not (endpoint.end != readings.NO_DAY).any():
        return
    last = readings.day_of(cutoff) if cutoff else int(endpoint.end.max())
    at_last = endpoint.end == last
    if at_last.sum() >= LEAST_ROWS_AT_CUTOFF and _share(endpoint.event, at_last) > 0.5:
        yield from endpoint.rows.findings(
            at_last & endpoint.event,
            "censor-suspicious",
            "doubt",
            f"most follow-up to {readings.date_of(last)} ends with an event on that very day",
            endpoint.rows.choice.parts["censor"],
            accepted=_ACCEPTED,
            remedy=f"check that 0 marks events; where it does not, {_REMEDY}",
        )


def _by_order(endpoint: EndpointRows) -> Iterator[Finding]:
    """Patients without an event are followed to the cutoff, so events come earlier than censoring as a rule.

    Judged without the arms: at the time of receipt nothing comparative may be told.
    """
    later = _share_later(endpoint.time[endpoint.event], endpoint.time[endpoint.censor > 0])
    if later > LATER_IS_SUSPICIOUS:
        yield finding(
            "censor-suspicious",
            "doubt",
            "times to event mostly longer than censored follow-up",
            endpoint.rows.where("censor"),
            f"the event later in {later:.0%} of pairs",
            _ACCEPTED,
            f"check that 0 marks events; where it does not, {_REMEDY}",
        )


def _share_later(events: Floats, censored: Floats) -> float:
    """Share of the pairs (event, censored) in which the event has the longer time; 0 with too few rows."""
    if min(events.size, censored.size) < LEAST_ROWS_TO_ORDER:
        return 0.0
    return float(np.searchsorted(np.sort(censored), events).mean() / censored.size)
