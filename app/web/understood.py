"""What was understood of an upload, as tables: files, endpoints, counts, changes; nothing compares arms."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from app.actions.receive import Incoming, Understanding
from app.model.extract import Changes, Extract
from app.sheets.blocks import Cell, Column, Line, Row, Table
from app.sheets.words import count, day_text, decimal, line, of_total

MOST_IDENTIFIERS = 5


def declared_table(incoming: Incoming) -> Table:
    """What a person said about the upload, to be read once more before it can no longer be changed."""
    extracted = "not stated" if incoming.extracted is None else day_text(incoming.extracted)
    cutoff = day_text(incoming.cutoff)
    rows = (("Declared as", incoming.kind), ("Data cutoff", cutoff), ("Extract", extracted))
    cells = tuple(Row(line(head), (Cell(line(text)),)) for head, text in rows)
    return Table(line("As declared"), (Column((), "words"),), cells)


@dataclass(frozen=True)
class Tables:
    """In the order in which a person checks: the right size, what moved, the right files and endpoints."""

    narrow: tuple[Table, ...]
    wide: tuple[Table, ...]


def understood_tables(understood: Understanding) -> Tables:
    extract = understood.extract
    narrow = (counts_table(understood), endpoints_table(extract))
    wide = (changes_table(understood.changes), files_table(extract))
    return Tables(*(tuple(table for table in tables if table.rows) for tables in (narrow, wide)))


def files_table(extract: Extract) -> Table:
    rows = tuple(
        Row(
            line(file.name),
            (
                Cell((count(file.n_rows),)),
                Cell(line(", ".join(file.columns_read) or "none")),
                Cell(line(", ".join(file.columns_left_out) or "none")),
            ),
        )
        for file in extract.files
    )
    columns = (Column(line("rows")), Column(line("columns read"), "words"), Column(line("not read"), "words"))
    return Table(line("Files as they were read"), columns, rows, line("File"))


def endpoints_table(extract: Extract) -> Table:
    rows = tuple(
        Row(line(parameter), (Cell(of_total(events, n_rows)),))
        for parameter, n_rows, events in extract.parameters
    )
    return Table(line("Endpoints in the extract"), (Column(line("events of rows")),), rows, line("Endpoint"))


def counts_table(understood: Understanding) -> Table:
    """Both arms together: whether to receive an extract must not depend on how they compare."""
    if understood.subjects is None or understood.events is None or understood.fraction is None:
        return Table(line("Counts"), (), ())
    rows = (
        Row(line("Events, of subjects"), (Cell(of_total(understood.events, understood.subjects)),)),
        Row(
            line(f"Information fraction{f' by {understood.by}' if understood.by else ''}"),
            (Cell(line(decimal(understood.fraction, 3))),),
        ),
    )
    return Table(line("Both arms together"), (Column(()),), rows)


def changes_table(changes: Changes | None) -> Table:
    """What differs from the last snapshot, each count under its own denominator."""
    if changes is None:
        return Table(line("Changes"), (), ())
    among = changes.n_common
    rows = (
        changed("New events", changes.new_events, among),
        changed("Events reversed", changes.reversed_events, among),
        changed("Events moved", changes.moved_events, among),
        changed("Arm changed", changes.changed_arm, among),
        changed("Stratum changed", changes.changed_stratum, among),
        changed("Subjects vanished", changes.vanished_subjects, among + len(changes.vanished_subjects)),
        changed("Subjects new", changes.new_subjects, among + len(changes.new_subjects)),
    )
    columns = (Column(line("of subjects")), Column(line("as received"), "words"))
    return Table(line("Since the last snapshot"), columns, rows, line("Change"))


def changed(words: str, subjects: Sequence[str], among: int) -> Row:
    expected = words in ("New events", "Subjects new")
    named = () if expected or not subjects else line(some(subjects))
    return Row(line(words), (Cell(of_total(len(subjects), among)), Cell(named)))


def some(identifiers: Sequence[str]) -> Line | str:
    """The first few, for questions to the data centre; the Data sheet of the look lists more."""
    more = len(identifiers) - MOST_IDENTIFIERS
    return ", ".join(identifiers[:MOST_IDENTIFIERS]) + (f" and {more} more" if more > 0 else "")
