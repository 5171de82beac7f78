"""The rows of an extract, by the part that each column plays under the plan, over one or several files."""

from __future__ import annotations

from collections.abc import Callable, Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from difflib import get_close_matches

import numpy as np

from app.intake import readings
from app.intake.csv_table import TextColumn, read_table
from app.intake.findings import finding, row_list
from app.model.extract import Finding, ReceivedFile, Severity
from app.model.plan import Columns
from app.model.values import Bools, Floats, Ints
from app.settings import Limits

NEEDED_PARTS = ("subject", "parameter", "arm", "time", "censor")
ENDPOINT_PARTS = ("parameter", "time", "censor")  # a file with these three columns is a time-to-event file
NAMED_OR_ADAM = {"start": "STARTDT", "end": "ADT", "event_text": "EVNTDESC"}
ADAM_ONLY = {"study": "STUDYID", "unit": "AVALU", "parameter_text": "PARAM"}
POOLED_PARTS = frozenset({"parameter", "time", "censor", "start", "end", "unit", "parameter_text"})


@dataclass(frozen=True)
class Choice:
    """Which column plays which part. A part that is optional and not there has no entry."""

    parts: Mapping[str, str]
    strata: tuple[str, ...]

    def only(self, parts: Collection[str]) -> Choice:
        return replace(self, parts={part: name for part, name in self.parts.items() if part in parts})

    @property
    def names(self) -> frozenset[str]:
        return frozenset({*self.parts.values(), *self.strata})


def choose(columns: Columns, headers: Sequence[Collection[str]]) -> Choice:
    """The plan's columns, and ADaM's optional ones where every file has them and they play no other part."""
    parts = {part: getattr(columns, part) for part in NEEDED_PARTS}
    taken = {*parts.values(), *columns.strata}
    for part, adam in {**NAMED_OR_ADAM, **ADAM_ONLY}.items():
        named = getattr(columns, part, None)
        if named:
            parts[part] = named
        elif adam not in taken and all(adam in header for header in headers):
            parts[part] = adam
    return Choice(parts, columns.strata)


def is_endpoint_file(columns: Columns, header: Collection[str]) -> bool:
    return all(getattr(columns, part) in header for part in ENDPOINT_PARTS)


def missing_columns(choice: Choice, header: Sequence[str], file: str) -> Iterator[Finding]:
    """A finding for each column that the plan needs and the file has not."""
    for name in dict.fromkeys([*choice.parts.values(), *choice.strata]):
        if name not in header:
            yield finding(
                "column-missing",
                "block",
                f"column {name!r} missing",
                file,
                _nearest(name, header),
                "the column names of the plan, letter by letter",
                "rename or add the column, or name another in the plan's table [columns]",
            )


def _nearest(name: str, header: Sequence[str]) -> str:
    same_but_case = [other for other in header if other.strip().lower() == name.lower()]
    if same_but_case:
        return f"{same_but_case[0]!r}, which differs in upper and lower case or blanks only"
    nearest = get_close_matches(name.upper(), {other.upper(): other for other in header}, n=1)
    if nearest:
        return f"no such column, the nearest is {_as_written(nearest[0], header)!r}"
    return f"{len(header)} other columns"


def _as_written(upper: str, header: Sequence[str]) -> str:
    return next(name for name in header if name.upper() == upper)


@dataclass(frozen=True, eq=False)
class Rows:
    """Rows of one or several files as text. `file` indexes `files`; `number` counts data rows from 1."""

    files: tuple[str, ...]
    choice: Choice
    file: Ints
    number: Ints
    parts: Mapping[str, TextColumn]
    strata: tuple[TextColumn, ...]

    def __len__(self) -> int:
        return int(self.number.size)

    def of_parameter(self, parameter: str) -> Rows:
        """The rows of one endpoint."""
        kept = self.parts["parameter"].where(lambda text: text == parameter)
        return replace(
            self,
            file=self.file[kept],
            number=self.number[kept],
            parts={part: column.kept(kept) for part, column in self.parts.items()},
            strata=tuple(column.kept(kept) for column in self.strata),
        )

    def where(self, part: str) -> str:
        """The files and the column of a part, as a sentence names them."""
        return f"{', '.join(self.files)}, column {self.choice.parts[part]}"

    def findings(
        self,
        at: Bools,
        id: str,
        severity: Severity,
        what: str,
        column: str,
        *,
        accepted: str,
        remedy: str,
        value: Callable[[int], str] | None = None,
    ) -> Iterator[Finding]:
        """A finding for each file that has rows where `at` is True; `value` tells what stands in a row."""
        for index, name in enumerate(self.files):
            places = np.flatnonzero(at & (self.file == index))
            if places.size:
                values = [value(int(place)) for place in places[:5]] if value else []
                numbers = self.number[places]
                found = row_list(numbers, values)
                where = f"{name}, column {column}"
                yield finding(id, severity, what, where, found, accepted, remedy, rows=numbers)


def read_rows(files: Sequence[ReceivedFile], choice: Choice, limits: Limits) -> Rows:
    """The chosen columns of all `files`, one file after the other."""
    tables = [read_table(file, choice.names, limits) for file in files]
    counts = [table.n_rows for table in tables]
    columns = {
        name: TextColumn.of(np.concatenate([table.columns[name] for table in tables]))
        for name in choice.names
    }
    return Rows(
        files=tuple(file.name for file in files),
        choice=choice,
        file=np.repeat(np.arange(len(files)), counts),
        number=np.concatenate([np.arange(1, count + 1) for count in counts]),
        parts={part: columns[name] for part, name in choice.parts.items()},
        strata=tuple(columns[name] for name in choice.strata),
    )


@dataclass(frozen=True, eq=False)
class EndpointRows:
    """The rows of one endpoint with their numbers and dates read.

    What could not be read holds readings.NO_NUMBER, NO_CENSOR or NO_DAY until a finding has told of it.
    """

    rows: Rows
    time: Floats
    censor: Ints
    start: Ints | None
    end: Ints | None

    @property
    def event(self) -> Bools:
        return np.equal(self.censor, 0)

    @property
    def days_by_dates(self) -> Ints | None:
        """ADT - STARTDT + 1, or NO_DAY where a date is missing; None without both columns."""
        if self.start is None or self.end is None:
            return None
        known = (self.start != readings.NO_DAY) & (self.end != readings.NO_DAY)
        return np.where(known, self.end - self.start + 1, readings.NO_DAY)


def endpoint_rows(rows: Rows) -> EndpointRows:
    def days(part: str) -> Ints | None:
        return rows.parts[part].decoded(readings.day, np.int64) if part in rows.parts else None

    return EndpointRows(
        rows,
        time=rows.parts["time"].decoded(readings.number, np.float64),
        censor=rows.parts["censor"].decoded(readings.censor, np.int64),
        start=days("start"),
        end=days("end"),
    )
