"""What the keys of a plan must be to each other. Each rule gives its sentences; none computes a bound."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import asdict
from itertools import pairwise
from typing import Any

from app.errors import DesignInvalid
from app.intake.places import Place, shown
from app.intake.plan_keys import FAMILIES
from app.model.plan import Columns

SAME_SPEND = 1e-9  # 1 - 0.9 is not quite 0.1 in a double

Values = Mapping[str, Any]  # the keys of one table that hold an acceptable value
Problems = Iterator[DesignInvalid]


def trial_rules(trial: Values, place: Place) -> Problems:
    start, end = trial.get("start_date"), trial.get("planned_end_date")
    if end is not None and (start is None or end <= start):
        yield DesignInvalid(
            "Planned end not after the start",
            where=str(place.key("planned_end_date")),
            found=f"{end} with start_date {start or 'left out'}",
            accepted="a date after start_date",
            remedy="correct the dates",
        )


def arms_rules(arms: Values, place: Place) -> Problems:
    control = arms.get("control")
    if control is not None and control == arms.get("experimental"):
        yield DesignInvalid(
            "The two arms have one name",
            where=str(place),
            found=f"{shown(control)} for control and for experimental",
            accepted="the two different values of the treatment column",
            remedy="correct one of them",
        )


def columns_rules(columns: Values, place: Place) -> Problems:
    """No column plays two parts, also not one that a part left out has by its ADaM name."""
    parts: dict[str, list[str]] = {}
    for key, value in {**asdict(Columns()), **columns}.items():
        for name in value if key == "strata" else (value,) if value else ():
            parts.setdefault(name, []).append(key)
    for name, keys in parts.items():
        if len(keys) > 1:
            yield DesignInvalid(
                "One column is given two parts",
                where=str(place),
                found=f"{shown(name)} for {' and '.join(keys)}",
                accepted="a different column for each part",
                remedy="correct one of them",
            )


def design_rules(design: Values, place: Place) -> Problems:
    alpha, power = design.get("alpha"), design.get("power")
    if alpha is not None and power is not None and power <= alpha:
        yield DesignInvalid(
            "Power not above alpha",
            where=str(place.key("power")),
            found=f"power {shown(power)} with alpha {shown(alpha)}",
            accepted="a power above alpha and below 1",
            remedy="correct power or alpha",
        )
    yield from _score_variance_rule(design, place)
    spend = design.get("safety_spend")
    if alpha is not None and spend is not None and spend >= alpha / design.get("sides", 1):
        yield DesignInvalid(
            "A safety look would spend all of alpha",
            where=str(place.key("safety_spend")),
            found=f"{shown(spend)} with alpha {shown(alpha)}",
            accepted="an alpha of one side, well below the plan's",
            remedy="lower safety_spend",
        )


def _score_variance_rule(design: Values, place: Place) -> Problems:
    by_variance = design.get("information", "events") == "score variance"
    given = design.get("planned_score_variance")
    if by_variance and given is None:
        yield _missing_companion("planned_score_variance", "information 'score variance'", place)
    if given is not None and not by_variance:
        yield _idle_companion("planned_score_variance", given, "information = 'score variance'", place)


def direction_rule(ratio: float | None, event_is: str, place: Place) -> Problems:
    """The hazard ratio planned for must favour experimental."""
    if ratio is not None and (ratio < 1) != (event_is == "bad"):
        side = "below 1 where the event is bad" if event_is == "bad" else "above 1 where the event is good"
        yield DesignInvalid(
            "The planned hazard ratio favours control",
            where=str(place.key("hazard_ratio")),
            found=f"{shown(ratio)} with event_is '{event_is}'",
            accepted=f"experimental / control, {side}",
            remedy="turn the ratio over, or correct event_is",
        )


def enrolment_rules(subjects: int | None, events: int | None, place: Place) -> Problems:
    if subjects is not None and events is not None and subjects < events:
        yield DesignInvalid(
            "Fewer subjects than events are planned",
            where=str(place.key("planned_subjects")),
            found=f"{subjects} subjects for {events} planned events",
            accepted="a whole number of at least planned_events",
            remedy="correct planned_subjects or planned_events",
        )


def family_rules(
    values: Values, place: Place, *, alpha_one_side: float | None, power: float | None = None
) -> Problems:
    """A spending function or family has the one key it needs, and no other's; futility spends 1 - `power`."""
    family = values.get("spending")
    needed = FAMILIES.get(family) if family else None
    if needed and needed not in values:
        yield _missing_companion(needed, f"spending {shown(family)}", place)
    for key in dict.fromkeys(FAMILIES.values()):
        if key and family and key != needed and key in values:
            owner = next(name for name, needs in FAMILIES.items() if needs == key)
            yield _idle_companion(key, values[key], f"spending = {shown(owner)}", place)
    points = values.get("points")
    if points and alpha_one_side is not None and points[-1][1] != alpha_one_side:
        yield DesignInvalid(
            "The spending table does not end at alpha",
            where=str(place.key("points")),
            found=f"{shown(points[-1][1])} at 1",
            accepted=f"{shown(alpha_one_side)}, the level of one side, at information fraction 1",
            remedy="correct the last point",
        )
    if points and power is not None and abs(points[-1][1] - (1.0 - power)) > SAME_SPEND:
        yield DesignInvalid(
            "The futility table does not end at the type II error",
            where=str(place.key("points")),
            found=f"{shown(points[-1][1])} at 1",
            accepted=f"{1.0 - power:.10g}, which is 1 - power, at information fraction 1",
            remedy="correct the last point",
        )


def futility_rules(futility: Values, place: Place) -> Problems:
    given = [key for key in ("spending", "rule") if key in futility]
    if len(given) != 1:
        yield DesignInvalid(
            "Futility needs one way to be decided",
            where=str(place),
            found=" and ".join(given) or "neither spending nor rule",
            accepted="either spending, or rule with limit",
            remedy="keep one of them",
        )
    if "rule" in futility and "limit" not in futility:
        yield _missing_companion("limit", f"rule {shown(futility['rule'])}", place)
    if "limit" in futility and "rule" not in futility:
        yield _idle_companion("limit", futility["limit"], "rule", place)
    if "rule" in futility and futility.get("binding"):
        yield DesignInvalid(
            "A futility rule is not binding",
            where=str(place.key("binding")),
            found=f"binding = true with rule {shown(futility['rule'])}",
            accepted="binding futility by spending only, as efficacy counts on its bounds",
            remedy="remove binding, or give futility a spending function",
        )
    if futility.get("rule") == "conditional power" and futility.get("limit", 0) >= 1:
        yield DesignInvalid(
            "A conditional power is below 1",
            where=str(place.key("limit")),
            found=shown(futility["limit"]),
            accepted="a number above 0 and below 1",
            remedy="correct limit",
        )


def one_sided_rule(sides: int | None, table: str, place: Place) -> Problems:
    if sides == 2:
        yield DesignInvalid(
            f"{table.capitalize()} goes with a one-sided plan only",
            where=str(place),
            found=f"table [{table}] with sides = 2",
            accepted=f"sides = 1, or a plan without [{table}]",
            remedy="remove the table, or make the plan one-sided",
        )


def analysis_rules(analysis: Values, place: Place) -> Problems:
    pair = ("prior_hazard_ratio", "prior_std_error")
    for key, other in (pair, pair[::-1]):
        if key in analysis and other not in analysis:
            yield _missing_companion(other, key, place)


def hypothesis_rules(hypotheses: Sequence[Values], place: Place) -> Problems:
    """Names tell hypotheses apart, and `after` points at one that exists."""
    names = ["primary", *(item["name"] for item in hypotheses if "name" in item)]
    yield from _shared_names(names, place)
    yield from _circle(hypotheses, place)
    for item in hypotheses:
        if "after" in item and (item["after"] not in names or item["after"] == item.get("name")):
            yield DesignInvalid(
                "A hypothesis waits for one that does not exist",
                where=str(place.key("after")),
                found=shown(item["after"]),
                accepted="'primary' or the name of another hypothesis",
                remedy="correct the name",
            )


def _shared_names(names: Sequence[str], place: Place) -> Problems:
    for name in sorted({name for name in names if names.count(name) > 1}):
        yield DesignInvalid(
            "Two hypotheses have one name",
            where=str(place),
            found=shown(name),
            accepted="a different name for each; 'primary' is the plan's own endpoint",
            remedy="rename one of them",
        )


def _circle(hypotheses: Sequence[Values], place: Place) -> Problems:
    waits = {item["name"]: item["after"] for item in hypotheses if "name" in item and "after" in item}
    circle = sorted(name for name in waits if _waits_for_itself(name, waits))
    if len(circle) > 1:  # one that waits for itself alone is told as a name that does not exist
        yield DesignInvalid(
            "Hypotheses wait for each other in a circle",
            where=str(place.key("after")),
            found=", ".join(map(shown, circle)),
            accepted="a chain that begins at 'primary' or at a hypothesis without after",
            remedy="let one of them wait for none of the others",
        )


def _waits_for_itself(name: str, waits: Mapping[str, str]) -> bool:
    """True where the chain of what it waits for comes back to it."""
    at, seen = waits.get(name), set[str]()
    while at is not None and at != name and at not in seen:
        seen.add(at)
        at = waits.get(at)
    return at == name


def endpoint_rules(hypotheses: Sequence[Values], place: Place, endpoint: Values, harm: Values) -> Problems:
    """Each hypothesis stands on an endpoint of its own, and harm counts bad events."""
    codes = [endpoint.get("parameter"), *(item.get("parameter") for item in hypotheses)]
    known = [code for code in codes if code is not None]
    for code in sorted({code for code in known if known.count(code) > 1}):
        yield DesignInvalid(
            "Two hypotheses stand on one endpoint",
            where=str(place.key("parameter")),
            found=shown(code),
            accepted="a parameter of its own for each, and none that is the plan's [endpoint]",
            remedy="correct the parameter, or remove one of them",
        )
    for item in hypotheses:
        if item.get("event_is") == "good" and item.get("parameter") == harm.get("parameter", ""):
            yield DesignInvalid(
                "Harm would be judged on an endpoint whose event is good",
                where=str(place.key("event_is")),
                found=f"event_is = 'good' for {shown(item['parameter'])}, which [harm] names",
                accepted="an endpoint with bad events for harm",
                remedy="correct event_is, or the parameter of [harm]",
            )


def calendar_rule(trial: Values, design: Values, place: Place) -> Problems:
    """Alpha spent by the calendar needs its two ends, and a planned end goes with nothing else."""
    by_calendar = design.get("spending_clock") == "calendar"
    for key in ("start_date", "planned_end_date"):
        if by_calendar and key not in trial:
            yield _missing_companion(key, "spending_clock 'calendar'", place)
    if "planned_end_date" in trial and not by_calendar:
        end = trial["planned_end_date"]
        yield _idle_companion("planned_end_date", end, "spending_clock = 'calendar'", place)


def held_rules(held: Sequence[Values], place: Place, design: Values) -> Problems:
    yield from _held_order(held, place)
    yield from _held_information(held, place, design)
    for item in held:
        if design.get("spending_clock") == "calendar" and "alpha_spent" not in item:
            yield _missing_companion("alpha_spent", "spending_clock 'calendar'", place)


def _held_information(held: Sequence[Values], place: Place, design: Values) -> Problems:
    events = [item["events"] for item in held if "events" in item and "efficacy_z" in item]
    if 0 in events:
        yield DesignInvalid(
            "A held look without events has a bound",
            where=str(place.key("efficacy_z")),
            found="efficacy_z with events = 0",
            accepted="a bound only where there were events to test",
            remedy="leave out efficacy_z, or correct the count",
        )
    if any(later <= earlier for earlier, later in pairwise(events)):
        yield DesignInvalid(
            "Events do not grow from one held look with a bound to the next",
            where=str(place.key("events")),
            found=shown(events),
            accepted="event counts, each above the one before",
            remedy="correct the counts, or leave out efficacy_z where a look had no bound",
        )
    if held and design.get("information") == "score variance":
        yield DesignInvalid(
            "Held looks carry no score variance",
            where=str(place),
            found="[[held]] with information = 'score variance'",
            accepted="held looks with information = 'events'",
            remedy="remove the held looks, or count information in events",
        )


def _held_order(held: Sequence[Values], place: Place) -> Problems:
    numbers = [item["number"] for item in held if "number" in item]
    if numbers != list(range(1, len(numbers) + 1)):
        yield DesignInvalid(
            "Held looks are not numbered in order",
            where=str(place.key("number")),
            found=shown(numbers),
            accepted="1, 2, 3 and on, in the order held",
            remedy="correct the numbers",
        )
    spent = [item["alpha_spent"] for item in held if "alpha_spent" in item]
    if spent != sorted(spent):
        yield DesignInvalid(
            "Alpha spent falls from one held look to the next",
            where=str(place.key("alpha_spent")),
            found=shown(spent),
            accepted="cumulative alpha of one side, never falling",
            remedy="correct the amounts",
        )


def _missing_companion(key: str, owner: str, place: Place) -> DesignInvalid:
    return DesignInvalid(
        f"Key {key} missing", where=str(place), found=f"{owner} without it", remedy=f"add a line for {key}"
    )


def _idle_companion(key: str, value: Any, owner: str, place: Place) -> DesignInvalid:
    return DesignInvalid(
        f"Key {key} has no meaning here",
        where=str(place.key(key)),
        found=shown(value),
        accepted=f"{key} only with {owner}",
        remedy=f"remove {key}, or correct what it goes with",
    )
