"""A CSV file is read as it was written: no text is changed, no row is shifted, no column is renamed."""

from __future__ import annotations

import csv
import io
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.intake.csv_table import TableRefused, TextColumn, read_header, read_table
from app.intake.extract import received_file
from app.settings import Limits


def table(content: str | bytes, wanted=("A", "B"), limits=Limits()):  # noqa: B008 - frozen
    content = content if isinstance(content, bytes) else content.encode()
    return read_table(received_file("t.csv", content), wanted, limits)


def columns(content: str | bytes, **kwargs) -> dict[str, list[str]]:
    return {name: list(texts) for name, texts in table(content, **kwargs).columns.items()}


def refusal(content: str | bytes, **kwargs) -> str:
    with pytest.raises(TableRefused) as caught:
        table(content, **kwargs)
    assert str(caught.value) == str(caught.value.finding)
    return caught.value.finding.id


def test_texts_that_look_like_numbers_or_missing_values_stay_texts():
    assert columns("A,B\n001,NA\n1e5,\nnull,NaN\n") == {"A": ["001", "1e5", "null"], "B": ["NA", "", "NaN"]}


def test_only_the_wanted_columns_are_taken():
    assert columns("A,B,C\n1,2,3\n", wanted=("C", "Z")) == {"C": ["3"]}


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
def test_line_ends_of_every_system_are_read(end):
    assert columns(end.join(["A,B", "1,2", "3,4", "", ""])) == {"A": ["1", "3"], "B": ["2", "4"]}


def test_a_byte_order_mark_is_no_part_of_the_first_name():
    assert read_header(received_file("t.csv", b"\xef\xbb\xbfA,B\n1,2\n")) == ("A", "B")


def test_quoted_commas_quotes_and_line_ends_divide_nothing():
    content = 'A,"B"\n"x, y","he said ""no"""\n"two\nlines",""\n'
    assert columns(content) == {"A": ["x, y", "two\nlines"], "B": ['he said "no"', ""]}


def test_a_header_may_hold_a_quoted_line_end():
    assert read_header(received_file("t.csv", b'A,"B\nb"\n1,2\n')) == ("A", "B\nb")


@given(
    st.lists(
        st.tuples(*[st.text(st.characters(codec="utf-8", exclude_characters="\0\r"), max_size=6)] * 3),
        min_size=1,
        max_size=8,
    )
)
def test_what_a_csv_writer_wrote_is_what_is_read(rows):
    text = io.StringIO(newline="")
    writer = csv.writer(text, lineterminator="\n", quoting=csv.QUOTE_ALL)
    writer.writerows([("A", "B", "C"), *rows])
    read = columns(text.getvalue(), wanted=("A", "B", "C"))
    assert list(zip(read["A"], read["B"], read["C"], strict=True)) == rows


@pytest.mark.parametrize(
    ("content", "id"),
    [
        ("", "file-empty"),
        (" \n\n", "file-empty"),
        ("A,B\n", "file-without-rows"),
        ("A,A\n1,2\n", "column-repeated"),
        ("A,\n1,2\n", "column-unnamed"),
        ("\nA,B\n1,2\n", "header-unreadable"),
        ('A,"B\n1,2\n', "quotes-misplaced"),
        ('A"x\ny",B\n1,2\n', "quotes-misplaced"),
        ("A," * 60_000 + "B\n1,2\n", "header-unreadable"),
        ("A;B\n1;2\n", "delimiter-not-comma"),
        ("A\tB\n1\t2\n", "delimiter-not-comma"),
        ("A,B\n1\n", "rows-ragged"),
        ("A,B\n1,2,3\n", "rows-ragged"),
        ("A,B\n1,2\n\n3,4\n", "rows-ragged"),
        ('A,B\n1,"2\n', "quotes-misplaced"),
        ('A,B\n1,2"x"\n', "quotes-misplaced"),
        ('A,B\n1,"2"x\n', "quotes-misplaced"),
        ("A,B\n1,2\0\n", "file-holds-nul"),
        (b"A,B\n1,\xe9\n", "file-not-utf8"),
        ("A,B\n1,2\n".encode("utf-16"), "file-not-utf8"),
    ],
)
def test_a_file_that_is_no_sound_table_is_refused_by_name(content, id):
    assert refusal(content) == id


def test_more_rows_than_the_limit_are_refused_before_they_are_read():
    limits = replace(Limits(), rows=2)
    assert refusal("A,B\n1,2\n3,4\n5,6\n", limits=limits) == "file-too-long"
    assert table("A,B\n1,2\n3,4\n", limits=limits).n_rows == 2


def test_ragged_rows_are_listed_to_five_with_their_width_and_counted():
    with pytest.raises(TableRefused) as caught:
        table("A,B\n" + "1\n" * 7)
    finding = caught.value.finding
    assert finding.rows == (1, 2, 3, 4, 5)
    assert finding.count == 7
    assert finding.found == (
        "7 rows, the first 1 (1 fields), 2 (1 fields), 3 (1 fields), 4 (1 fields), 5 (1 fields)"
    )


def test_a_column_reads_each_text_once():
    column = TextColumn.of(np.array(["b", "a", "b", "b"], dtype=object))
    seen: list[str] = []
    assert column.decoded(lambda text: seen.append(text) or len(seen), np.int64).tolist() == [1, 2, 1, 1]
    assert seen == ["b", "a"]


def test_kept_rows_leave_no_text_behind():
    column = TextColumn.of(np.array(["b", "a", "c", "a"], dtype=object)).kept(
        np.array([False, True, True, True])
    )
    assert column.texts == ("a", "c")
    assert [column.at(row) for row in range(3)] == ["a", "c", "a"]
