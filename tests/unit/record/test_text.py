"""A record as text: the same bytes every time, and every double back to the last bit."""

from __future__ import annotations

import json
import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.record.canonical import parse_strict
from app.record.text import record_bytes

values = st.recursive(
    st.none()
    | st.booleans()
    | st.integers(-(2**53) + 1, 2**53 - 1)
    | st.floats(allow_nan=False, allow_infinity=False)
    | st.text('aé−"\\\n\u00a0'),
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.text("abz"), inner, max_size=3),
    max_leaves=12,
)


@given(st.dictionaries(st.text("abz"), values, max_size=4))
def test_what_is_written_reads_back_exactly(record: dict) -> None:
    again = parse_strict(record_bytes(record))
    assert again == record
    assert repr(again) == repr(record)  # also -0.0, 1.0 against 1, and the order of the keys


def test_a_record_is_laid_out_for_a_person() -> None:
    record = {"looks": [{"number": 1, "z": 0.1}, {"number": 2, "z": 1e-300}], "rows": [1, 2], "cutoff": None}
    assert record_bytes(record).decode() == (
        "{\n"
        ' "looks": [\n'
        "  {\n"
        '   "number": 1,\n'
        '   "z": 0.1\n'
        "  },\n"
        "  {\n"
        '   "number": 2,\n'
        '   "z": 1e-300\n'
        "  }\n"
        " ],\n"
        ' "rows": [1, 2],\n'
        ' "cutoff": null\n'
        "}\n"
    )


@pytest.mark.parametrize("number", [math.nan, math.inf])
def test_what_is_no_number_is_never_written(number: float) -> None:
    with pytest.raises(ValueError, match="JSON compliant"):
        record_bytes({"z": number})


def test_any_json_reader_reads_it() -> None:
    assert json.loads(record_bytes({"label": "Herz−Kreislauf"})) == {"label": "Herz−Kreislauf"}
