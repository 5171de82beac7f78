"""The parts of a plan that are read and checked, but whose computing this version does not do.

Each is refused by name, never silently ignored. Whoever adds the computing takes the line out here.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from app.errors import DesignInvalid
from app.intake.places import Place, shown


@dataclass(frozen=True)
class NotComputed:
    """A table, or a key of a table."""

    table: str
    what: str
    key: str | None = None


NOT_COMPUTED = (
    NotComputed("enrolment", "a monthly rate of enrolment is not used", key="planned_per_month"),
    NotComputed("enrolment", "drop-out for forecasts is not used", key="dropout_per_year"),
    NotComputed("analysis", "subgroups are not computed", key="subgroups"),
    NotComputed("columns", "an adjudication column is not read", key="adjudicated"),
    NotComputed("columns", "a cause column is not read", key="cause"),
    NotComputed("columns", "a site column is not read", key="site"),
    NotComputed("columns", "a last-contact column is not read", key="last_contact"),
    NotComputed("columns", "an analysis-set column is not read", key="analysis_set"),
)


def not_computed_parts(
    document: Mapping[str, Any], accepted: Mapping[str, Sequence[Mapping[str, Any]]], place: Place
) -> Iterator[DesignInvalid]:
    """A sentence for each part that the plan asks for and this version does not compute.

    `document` is the plan as written, `accepted` its tables with the keys whose values lie in their domains.
    """
    for part in NOT_COMPUTED:
        written = document.get(part.table)
        if part.key is None and written is not None:
            yield _refused_table(part, place.table(part.table, repeated=isinstance(written, list)))
        elif part.key is not None and any(part.key in values for values in accepted.get(part.table, ())):
            yield _refused_key(part, part.key, document[part.table][part.key], place.table(part.table))


def _refused_table(part: NotComputed, place: Place) -> DesignInvalid:
    return DesignInvalid(
        f"{part.what} by this version",
        where=str(place),
        remedy="remove the table, or use a version that does so",
    )


def _refused_key(part: NotComputed, key: str, value: Any, place: Place) -> DesignInvalid:
    return DesignInvalid(
        f"{part.what} by this version",
        where=str(place.key(key)),
        found=shown(value),
        accepted="the table without this key",
        remedy="change the plan, or use a version that does so",
    )
