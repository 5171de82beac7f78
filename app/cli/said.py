"""Values of a record as a terminal shows them: the formats of the sheets, in signs every terminal has."""

from __future__ import annotations

import sys
from collections.abc import Iterable
from typing import Any

from app.errors import sentence
from app.model.extract import Finding
from app.model.values import Absent, Estimate
from app.sheets import words
from app.sheets.blocks import Line, Span
from app.sheets.further import named

PLAIN = str.maketrans({"\u2212": "-", "\u00a0": " ", "\u2007": " ", "\u2011": "-"})


def plain(text: Span | Line | str) -> str:
    """Typeset text without the signs that only typesetting needs."""
    if isinstance(text, Span):
        text = text.text
    elif not isinstance(text, str):
        text = "".join(span.text for span in text)
    return text.translate(PLAIN)


def estimate(value: Any) -> Estimate:
    """A number of the record, or the reason why there is none."""
    return Absent(value["not_estimable"]) if isinstance(value, dict) else float(value)


def number(value: Any, places: int = 3) -> str:
    return plain(words.number(estimate(value), places))


def percent(value: Any) -> str:
    return plain(words.percent(estimate(value)))


def p_value(*values: Any) -> list[str]:
    """p-values that stand beside each other, in one precision."""
    return [plain(span) for span in words.p_values(*map(estimate, values))]


def alpha(value: Any) -> str:
    return plain(words.alpha(float(value)))


def bound(value: Any, places: int = 3) -> str:
    """A bound, or a dash where the look has none; the reason is in the record."""
    return "-" if isinstance(value, dict) else number(value, places)


def hypothesis(name: str) -> str:
    """What a hypothesis waits for, as the sheets name it."""
    return plain(named(name)).replace("’", "'")


def tell(findings: Iterable[Finding]) -> None:
    """Findings on standard error, a line each; what blocks is raised elsewhere."""
    for found in findings:
        if found.severity != "block":
            print(f"{found.severity} {found.id}: {found}", file=sys.stderr)


def finding(found: dict[str, Any]) -> str:
    """A finding of the record as one line."""
    parts = (found[name] for name in ("what", "where", "found", "accepted", "remedy"))
    return f"{found['severity']} {found['id']}: {sentence(*parts)}"
