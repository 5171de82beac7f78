"""Read a plan file: every key checked, everything wrong told at once, nothing silently ignored."""

from __future__ import annotations

import hashlib
import re
import tomllib
from collections.abc import Iterator, Mapping, Sequence
from difflib import get_close_matches
from typing import Any

from app.errors import DesignInvalid, sentence
from app.intake import plan_rules as rules
from app.intake.domains import Domain
from app.intake.not_computed import not_computed_parts
from app.intake.places import Place, shown
from app.intake.plan_keys import TABLES, Table
from app.model.plan import Efficacy, Plan
from app.sequential.effect import plan_rules
from app.settings import Limits

FORMAT = 1
_FIELD_OF_TABLE = {"hypothesis": "hypotheses"}  # Plan's field where it differs from the table's name


class PlanRefused(DesignInvalid):
    """A plan with at least one problem; str() is all their sentences, one a line."""

    def __init__(self, problems: Sequence[DesignInvalid]) -> None:
        first = problems[0]
        super().__init__(
            first.what, where=first.where, found=first.found, accepted=first.accepted, remedy=first.remedy
        )
        self.problems = tuple(problems)

    def __str__(self) -> str:
        return "\n".join(
            sentence(each.what, each.where, each.found, each.accepted, each.remedy) for each in self.problems
        )


def read_plan(content: bytes, *, name: str, limits: Limits) -> Plan:
    """The plan written in `content`, or PlanRefused with everything that is wrong in it.

    `name` is the file's name as sentences show it. The plan's digest is the SHA-256 of `content`.
    """
    place = Place(name)
    document = _parse(content, place, limits)
    problems = [*_top_level_problems(document, place)]
    tables = {key: _read_tables(key, document, place, problems) for key in TABLES if key in document}
    problems += _rule_problems(tables, place)
    problems += not_computed_parts(document, tables, place)
    if problems:
        raise PlanRefused(problems)
    return _feasible(_plan(tables, digest=hashlib.sha256(content).hexdigest()))


def _feasible(plan: Plan) -> Plan:
    """The plan, once its futility boundary has been found to leave room for its power."""
    try:
        plan_rules(plan)
    except DesignInvalid as problem:
        raise PlanRefused([problem]) from problem
    return plan


def _parse(content: bytes, place: Place, limits: Limits) -> dict[str, Any]:
    if len(content) > limits.plan_bytes:
        raise _unreadable(
            "The plan file is too large",
            place,
            found=f"{len(content)} bytes",
            accepted=f"at most {limits.plan_bytes} bytes",
        )
    try:
        return tomllib.loads(content.decode("utf-8-sig"))
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
        raise _unreadable(
            "The plan file is not UTF-8",
            place,
            found=f"byte 0x{content[error.start]:02x} on line {line}",
            accepted="TOML in UTF-8",
        ) from error
    except (ValueError, RecursionError) as error:  # TOMLDecodeError is a ValueError; so is a number too long
        raise _unreadable(
            "The plan file is not TOML", place, found=_toml_fault(error), accepted="TOML 1.0"
        ) from error


def _unreadable(what: str, place: Place, *, found: str, accepted: str) -> PlanRefused:
    return PlanRefused(
        [DesignInvalid(what, where=str(place), found=found, accepted=accepted, remedy="correct the file")]
    )


def _toml_fault(error: Exception) -> str:
    """What the parser says, its line first."""
    if isinstance(error, RecursionError):
        return "lists or tables nested too deeply"
    text = str(error).splitlines()[0]
    matched = re.fullmatch(r"(?P<fault>.*) \(at (?:line (?P<line>\d+), column \d+|end of document)\)", text)
    if not matched:
        return text
    position = f"line {matched['line']}" if matched["line"] else "the end of the file"
    return f"at {position}: {matched['fault'][0].lower()}{matched['fault'][1:]}"


def _top_level_problems(document: Mapping[str, Any], place: Place) -> Iterator[DesignInvalid]:
    known = ("format", *TABLES)
    for key in document:
        if key not in known:
            yield _unknown_key(key, known, place)
    written = document.get("format")
    if type(written) is not int or written != FORMAT:
        yield DesignInvalid(
            "Plan format not known",
            where=str(place.key("format")),
            found="no such key" if written is None else shown(written),
            accepted=f"format = {FORMAT} as the first line",
            remedy="write that line, or use the version that wrote the plan",
        )
    for key, table in TABLES.items():
        if table.required and key not in document:
            yield DesignInvalid(
                f"Table [{key}] missing",
                where=str(place),
                accepted=f"a table [{key}] with {', '.join(table.required_keys)}",
                remedy="add the table",
            )


# What the program does not do at all, by the words that plans have for it
_NOT_SUPPORTED = {
    r"margin|non.?inferior": "a non-inferiority margin is not supported",
    r"entry|truncat": "delayed entry is not supported",
    r"\b(third|second|other)|(arm|experimental|control).?\d": "a third arm is not supported",
}


def _unknown_key(key: str, known: Sequence[str], place: Place) -> DesignInvalid:
    for words, what in _NOT_SUPPORTED.items():
        if re.search(words, key, re.IGNORECASE) and key.lower() not in known:
            return DesignInvalid(
                what,
                where=str(place),
                found=f"key {shown(key)}",
                accepted="two arms, followed from randomisation, compared for superiority",
                remedy="remove the key",
            )
    nearest = get_close_matches(key.lower(), known, n=1, cutoff=0.0)[0]
    home = [table for table, spec in TABLES.items() if key in spec.known]
    where_known = f", or move it to [{home[0]}]" if home else ""
    return DesignInvalid(
        f"Unknown key {shown(key)}",
        where=str(place),
        accepted=", ".join(known),
        remedy=f"write '{nearest}', the nearest known key{where_known}, or remove it",
    )


Values = dict[str, Any]


def _read_tables(
    key: str, document: Mapping[str, Any], place: Place, problems: list[DesignInvalid]
) -> list[Values]:
    """The acceptable values of the table `key`, as many times as it is written."""
    table, written = TABLES[key], document[key]
    items = written if table.repeated else [written]
    if not isinstance(items, list) or not all(isinstance(item, dict) for item in items):
        heading = f"[[{key}]]" if table.repeated else f"[{key}]"
        problems.append(_not_a_table(key, written, heading, place))
        return []
    places = [
        place.table(key, number=number if table.repeated else None, repeated=table.repeated)
        for number in range(1, len(items) + 1)
    ]
    return [_read_table(table, item, where, problems) for item, where in zip(items, places, strict=True)]


def _not_a_table(key: str, written: Any, heading: str, place: Place) -> DesignInvalid:
    return DesignInvalid(
        f"{key} is not written as {heading}",
        where=str(place.key(key)),
        found=shown(written),
        accepted=f"a table headed {heading}",
        remedy=f"write its keys under the line {heading}",
    )


def _read_table(
    table: Table, written: Mapping[str, Any], place: Place, problems: list[DesignInvalid]
) -> Values:
    """The keys of one table that hold acceptable values; what is wrong goes to `problems`."""
    problems += [_unknown_key(key, table.known, place) for key in written if key not in table.known]
    problems += [_missing_key(key, table, place) for key in table.required_keys if key not in written]
    values: Values = {}
    for key, domain in table.keys.items():
        if key in written and domain.holds(written[key]):
            values[key] = domain.convert(written[key])
        elif key in written:
            problems.append(_outside(key, written[key], domain, place))
    for key, inner in table.inner.items():
        if isinstance(written.get(key), dict):
            values[key] = _read_table(inner, written[key], place.key(key), problems)
        elif key in written:
            problems.append(_not_a_table(key, written[key], f"{key} = {{...}}", place))
    return values


def _missing_key(key: str, table: Table, place: Place) -> DesignInvalid:
    accepted = table.keys[key].accepted if key in table.keys else "a table in braces"
    return DesignInvalid(
        f"Key {key} missing", where=str(place), accepted=accepted, remedy=f"add a line for {key}"
    )


def _outside(key: str, value: Any, domain: Domain, place: Place) -> DesignInvalid:
    return DesignInvalid(
        f"{key} outside its domain",
        where=str(place.key(key)),
        found=shown(value),
        accepted=domain.accepted,
        remedy="correct the value",
    )


def _rule_problems(tables: Mapping[str, list[Values]], place: Place) -> Iterator[DesignInvalid]:
    """What the values are to each other; a key that is missing or refused takes part in no rule."""

    def one(key: str) -> Values:
        return tables[key][0] if tables.get(key) else {}

    design, event_is = one("design"), one("endpoint").get("event_is", "bad")
    alpha, sides = design.get("alpha"), design.get("sides")
    alpha_one_side = alpha / sides if alpha and sides else None
    yield from rules.trial_rules(one("trial"), place.table("trial"))
    yield from rules.calendar_rule(one("trial"), design, place.table("trial"))
    yield from rules.arms_rules(one("arms"), place.table("arms"))
    yield from rules.columns_rules(one("columns"), place.table("columns"))
    yield from rules.design_rules(design, place.table("design"))
    yield from rules.direction_rule(design.get("hazard_ratio"), event_is, place.table("design"))
    yield from rules.family_rules(one("efficacy"), place.table("efficacy"), alpha_one_side=alpha_one_side)
    yield from rules.enrolment_rules(
        one("enrolment").get("planned_subjects"), design.get("planned_events"), place.table("enrolment")
    )
    for key in ("futility", "harm"):
        if tables.get(key):
            yield from rules.one_sided_rule(sides, key, place.table(key))
    if tables.get("futility"):
        yield from rules.futility_rules(one("futility"), place.table("futility"))
        yield from rules.family_rules(
            one("futility"), place.table("futility"), alpha_one_side=None, power=design.get("power")
        )
    yield from rules.analysis_rules(one("analysis"), place.table("analysis"))
    yield from _repeated_problems(tables, place)


def _repeated_problems(tables: Mapping[str, list[Values]], place: Place) -> Iterator[DesignInvalid]:
    hypotheses = tables.get("hypothesis", [])
    first = {key: tables[key][0] for key in ("design", "endpoint", "harm") if tables.get(key)}
    design = first.get("design", {})
    where = place.table("hypothesis", repeated=True)
    yield from rules.hypothesis_rules(hypotheses, where)
    yield from rules.endpoint_rules(hypotheses, where, first.get("endpoint", {}), first.get("harm", {}))
    for number, item in enumerate(hypotheses, 1):
        inner = place.table("hypothesis", number=number, repeated=True).key("efficacy")
        alpha, sides = item.get("alpha"), design.get("sides")
        level = alpha / sides if alpha and sides else None
        yield from rules.family_rules(item.get("efficacy", {}), inner, alpha_one_side=level)
    yield from rules.held_rules(tables.get("held", []), place.table("held", repeated=True), design)


def _plan(tables: Mapping[str, list[Values]], *, digest: str) -> Plan:
    """The model's nouns, made of values that have all been accepted."""
    parts: dict[str, Any] = {}
    for key, items in tables.items():
        nouns = tuple(_noun(TABLES[key], item) for item in items)
        parts[_FIELD_OF_TABLE.get(key, key)] = nouns if TABLES[key].repeated else nouns[0]
    columns = parts.pop("columns", None) or TABLES["columns"].noun()
    return Plan(columns=columns, digest=digest, **parts)


def _noun(table: Table, values: Values) -> Any:
    named = {table.field_names.get(key, key): value for key, value in values.items()}
    for key in table.inner:
        named[key] = Efficacy(**named[key])
    return table.noun(**{**dict.fromkeys(table.optional), **named})
