"""Tables as CSV: what the page shows, as numbers for other programs and never as a formula."""

from __future__ import annotations

import csv
import io
from dataclasses import replace

from app.render.csv_tables import field, sheet_tables, table_csv
from app.sheets.blocks import Span
from tests.render import invented_book as invented


def rows(content: bytes) -> list[list[str]]:
    return list(csv.reader(io.StringIO(content.decode(), newline="")))


def test_every_table_of_a_sheet_has_a_file() -> None:
    boundary = invented.book().sheet("boundary")
    assert boundary is not None
    assert [name for name, _ in sheet_tables(boundary)] == [f"boundary-{n}.csv" for n in (1, 2, 3, 4)]
    *_, folded = sheet_tables(replace(boundary, folded=(invented.estimates_table("not crossed"),)))
    assert folded == ("boundary-5.csv", table_csv(invented.estimates_table("not crossed")))


def test_a_file_says_what_the_page_says() -> None:
    table = rows(table_csv(invented.looks_table()))
    assert table[0][:3] == ["Look", "Information fraction", "Events"]
    assert table[1] == ["1", "0.266", "143", "0.504", "4.193", "0.495", "-0.770", "0.0000138", "frozen"]


def test_an_interval_under_an_estimate_has_a_column_of_its_own() -> None:
    table = rows(table_csv(invented.estimates_table("not crossed")))
    assert table[0] == [
        "Estimates with 95% intervals",
        "Tablet (B)",
        "Tablet (B) interval",
        "Placebo (A)",
        "Placebo (A) interval",
    ]
    assert ["at 24 months", "57.5", "52.2 to 62.4", "48.2", "42.4 to 53.8"] in table


def test_numbers_stay_numbers_and_formulas_become_text() -> None:
    assert field((Span("−20.80"),)) == "-20.80"
    assert field((Span("=1+1"),)) == "'=1+1"
    assert field((Span("@SUM(A1)"),)) == "'@SUM(A1)"
    assert field((Span("−cmd|' /C calc'!A0"),)).startswith("'")
    assert field((Span("–"),)) == "–"
