"""The tables of a sheet as CSV: what the page shows, in characters that other programs read as numbers."""

from __future__ import annotations

import csv
import io
import re

from app.render.svg.lettering import plain
from app.sheets.blocks import Cell, Line, Row, Sheet, Table

# true minus, non-breaking hyphen; spaces that do not break
AS_TYPED = str.maketrans({"−": "-", "\u2011": "-", "\u00a0": " ", "\u202f": " ", "\u2007": " "})
FORMULA_STARTS = ("=", "+", "-", "@", "\t", "\r")
NUMBER = re.compile(r"-?\d[\d ]*(\.\d+)?")


def sheet_tables(sheet: Sheet) -> tuple[tuple[str, bytes], ...]:
    """Every table of a sheet as (file name, bytes): the figure's own numbers first, the folded ones last."""
    tables = (*sheet.figure_tables, *sheet.wide_tables, *sheet.tables, *sheet.folded)
    return tuple((f"{sheet.key}-{n}.csv", table_csv(table)) for n, table in enumerate(tables, start=1))


def table_csv(table: Table) -> bytes:
    """A head, then a row a line; a column that has something under its numbers is followed by that."""
    has_below = [any(row.cells[i].below for row in table.rows) for i in range(len(table.columns))]
    written = io.StringIO(newline="")
    writer = csv.writer(written)
    writer.writerow(_head(table, has_below))
    writer.writerows(_row(row, has_below) for row in table.rows)
    return written.getvalue().encode()


def _head(table: Table, has_below: list[bool]) -> list[str]:
    heads = [field(table.corner or table.caption)]
    for column, below in zip(table.columns, has_below, strict=True):
        heads += [field(column.head)] + [f"{field(column.head)} interval".strip()] * below
    return heads


def _row(row: Row, has_below: list[bool]) -> list[str]:
    fields = [field(row.head)]
    for cell, below in zip(row.cells, has_below, strict=True):
        fields += _cell(cell, below)
    return fields


def _cell(cell: Cell, below: bool) -> list[str]:
    return [field(cell.line)] + [field(cell.below)] * below


def field(line: Line) -> str:
    """Plain text; what a spreadsheet would run as a formula is marked as text, numbers stay numbers."""
    text = plain(line).translate(AS_TYPED)
    runs_as_formula = text.startswith(FORMULA_STARTS) and not NUMBER.fullmatch(text)
    return f"'{text}" if runs_as_formula and len(text) > 1 else text
