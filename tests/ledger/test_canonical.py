"""Canonical JSON: one value, one sequence of bytes."""

from __future__ import annotations

import json
import math
import struct

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as some

from app.errors import ValueRejected
from app.record.canonical import LARGEST_INTEGER, canonical_bytes, digest, parse_strict

characters = some.characters(exclude_categories=["Cs"])
integers = some.integers(-LARGEST_INTEGER, LARGEST_INTEGER)
leaves = some.none() | some.booleans() | integers | some.text(characters)
plain_values = some.recursive(
    leaves, lambda inner: some.lists(inner) | some.dictionaries(some.text(characters), inner), max_leaves=20
)


def test_keys_stand_in_the_order_of_their_utf16_code_units() -> None:
    # RFC 8785, section 3.2.3, the sorting example (from memory)
    names = {
        "\u20ac": "Euro Sign",
        "\r": "Carriage Return",
        "\ufb33": "Hebrew Letter Dalet With Dagesh",
        "1": "One",
        "\U0001f600": "Emoji: Grinning Face",
        "\u0080": "Control",
        "\u00f6": "Latin Small Letter O With Diaeresis",
    }
    assert list(json.loads(canonical_bytes(names)).values()) == [
        "Carriage Return",
        "One",
        "Control",
        "Latin Small Letter O With Diaeresis",
        "Euro Sign",
        "Emoji: Grinning Face",
        "Hebrew Letter Dalet With Dagesh",
    ]


def test_strings_and_literals_are_written_as_the_standard_writes_them() -> None:
    # RFC 8785, section 3.2.2, the example object (from memory), without its numbers
    value = {"string": "\u20ac$\u000f\u000aA'\u0042\u0022\u005c\\\"/", "literals": [None, True, False]}
    assert canonical_bytes(value) == (
        b'{"literals":[null,true,false],"string":"\xe2\x82\xac$\\u000f\\nA\'B\\"\\\\\\\\\\"/"}'
    )


def test_floats_are_strings_with_the_digits_of_the_standard() -> None:
    # RFC 8785, section 3.2.2, the numbers of the example (from memory); there they stand without quotes
    numbers = [333333333.33333329, 1e30, 4.50, 2e-3, 0.000000000000000000000000001]
    assert canonical_bytes(numbers) == b'["333333333.3333333","1e+30","4.5","0.002","1e-27"]'


def test_a_float_of_numpy_is_written_like_any_other() -> None:
    assert canonical_bytes([np.float64(0.1)]) == b'["0.1"]'


def test_the_digest_is_sha256() -> None:
    # FIPS 180-2, appendix B.1, the message "abc" (from memory)
    assert digest(b"abc") == "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"


@given(plain_values)
def test_what_is_written_reads_back_the_same(value: object) -> None:
    assert parse_strict(canonical_bytes(value)) == value


@given(some.dictionaries(some.text(characters), plain_values))
def test_the_order_in_which_keys_were_given_does_not_matter(value: dict[str, object]) -> None:
    turned = dict(reversed(value.items()))
    assert canonical_bytes(turned) == canonical_bytes(value)


@given(plain_values)
def test_canonical_text_is_its_own_canonical_form(value: object) -> None:
    written = canonical_bytes(value)
    assert canonical_bytes(parse_strict(written)) == written


@given(some.floats(allow_nan=False, allow_infinity=False))
def test_a_float_comes_back_bit_for_bit(value: float) -> None:
    text = parse_strict(canonical_bytes(value))
    assert struct.pack("<d", float(text)) == struct.pack("<d", value)


@pytest.mark.parametrize("value", [math.nan, math.inf, -math.inf, LARGEST_INTEGER + 1, "\ud800"])
def test_what_has_no_canonical_form_is_a_bug_in_the_caller(value: object) -> None:
    with pytest.raises(ValueError):
        canonical_bytes([value])


@pytest.mark.parametrize("value", [{1: "one"}, {"a", "b"}, b"bytes", np.int64(1), object()])
def test_a_type_without_a_canonical_form_is_a_bug_in_the_caller(value: object) -> None:
    with pytest.raises(TypeError):
        canonical_bytes(value)


@pytest.mark.parametrize(
    ("text", "found"),
    [
        (b'{"z": NaN}', "NaN"),
        (b"[Infinity]", "Infinity"),
        (b"[-Infinity]", "-Infinity"),
        (b"[1e999]", "1e999, which no double holds"),
        (b'{"z": 1, "z": 2}', "the key 'z' twice in one object"),
        (b"[9007199254740992]", "an integer beyond 2^53 - 1"),
        (b"[" + b"9" * 5000 + b"]", "an integer beyond 2^53 - 1"),
        (b"[" * 100_000, "brackets nested too deeply"),
        (b'["\\ud83d"]', "half a surrogate pair, which is no character"),
        (b'["\xff"]', "'utf-8' codec can't decode byte 0xff in position 2: invalid start byte"),
        (b"[1 2]", "Expecting ',' delimiter: line 1 column 4 (char 3)"),
        (b"", "Expecting value: line 1 column 1 (char 0)"),
    ],
    ids=lambda part: str(part[:20]),
)
def test_text_with_more_than_one_meaning_is_refused_with_a_sentence(text: bytes, found: str) -> None:
    with pytest.raises(ValueRejected) as refused:
        parse_strict(text, where="report.html")
    assert str(refused.value).startswith(f"Text that is not strict JSON in report.html. Found {found[:20]}")


def test_a_whole_surrogate_pair_is_read() -> None:
    assert parse_strict(b'["\\ud83d\\ude00"]') == ["\U0001f600"]
