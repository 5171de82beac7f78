"""Two records compared: numbers to 1e-9 relative, counts and words exactly, each place named."""

from __future__ import annotations

from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.verification.comparison import differences


def found(stored: Any, computed: Any) -> list[str]:
    return [str(difference) for difference in differences(stored, computed)]


def test_a_record_agrees_with_itself_whenever_and_by_whatever_version_it_was_made() -> None:
    stored = {"run_at": "2027-01-01", "program": {"version": "1"}, "looks": [{"z": 2.5}]}
    computed = {"run_at": "2031-01-01", "program": {"version": "9"}, "looks": [{"z": 2.5}]}
    assert found(stored, computed) == []


def test_time_and_program_count_inside_a_look() -> None:
    assert found({"look": {"run_at": 1}}, {"look": {"run_at": 2}}) == ["look.run_at: stored 1, computed 2"]


@given(st.floats(-1e300, 1e300, allow_subnormal=False), st.floats(-0.99e-9, 0.99e-9))
def test_another_processor_s_last_bits_are_no_difference(value: float, relative: float) -> None:
    assert found(value, value * (1 + relative)) == []


@given(st.floats(1e-290, 1e300), st.floats(1.01e-9, 1.0))
def test_anything_beyond_a_billionth_is_a_difference_whatever_the_size(value: float, relative: float) -> None:
    """Also of an alpha of 1e-15 that was spent at a very early look."""
    assert len(found(value, value * (1 + relative))) == 1
    assert len(found(value, value * (1 - relative))) == 1


@pytest.mark.parametrize(
    ("stored", "computed", "said"),
    [
        ({"events": 384}, {"events": 385}, "events: stored 384, computed 385"),
        ({"events": 10**9}, {"events": 10**9 + 1}, "events: stored 1000000000, computed 1000000001"),
        ({"events": 384}, {"events": 384.0}, "events: stored 384, computed 384.0"),
        ({"final": True}, {"final": 1}, "final: stored True, computed 1"),
        ({"crossed": "none"}, {"crossed": "efficacy"}, "crossed: stored 'none', computed 'efficacy'"),
        ({"z": None}, {"z": 0.0}, "z: stored None, computed 0.0"),
        ({"a": [{"z": 2.5}]}, {"a": [{"z": 2.6}]}, "a[0].z: stored 2.5, computed 2.6"),
        ({"a": [1, 2]}, {"a": [1]}, "a: stored list of 2, computed list of 1"),
        ({"a": {"z": 1}}, {"a": {"p": 1}}, "a: stored dict of 1, computed dict of 1"),
        ({"a": {"not_estimable": "x"}}, {"a": 2.5}, "a: stored dict of 1, computed 2.5"),
    ],
)
def test_each_difference_names_its_place_and_both_values(stored: Any, computed: Any, said: str) -> None:
    assert found(stored, computed) == [said]
