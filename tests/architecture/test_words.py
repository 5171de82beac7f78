"""One word for one idea, and nothing that belongs to one machine or one place on the network."""

from __future__ import annotations

import pytest

from tests.architecture.sources import matches, own_texts, tracked

# A letter in brackets keeps a pattern from finding itself.
BANNED = {
    r"(?i)\bcut[-]off": "cutoff",
    r"(?i)\b(un)?[b]lind(ed|ing)\b": "masked, unmasked",
    r"(?i)\bKaplan [M]eier\b": "Kaplan-Meier",
    r"(?i)\blog[ ]rank\b": "log-rank",
    r"\b(O[B]F|H[S]D)\b": "the method's authors, spelled out",
    r"(?i)\btran[s]cripts?\b|\blec[t]ures?\b|\bseed[ ]document": "the publication itself",
}

NAMES_NO_PLACE = r"https?://(?!www\.w3\.org/|127\\?\.0\\?\.0\\?\.1|localhost|[\w.-]+\.(?:example|test|invalid)\b|[\[{$\"'`\s)])\S*"


@pytest.mark.parametrize("pattern", BANNED, ids=BANNED.values())
def test_one_idea_has_one_word(pattern: str) -> None:
    found = matches(pattern, own_texts())
    assert not found, "\n".join(found)


def test_no_address_of_another_machine_is_in_any_file() -> None:
    found = matches(NAMES_NO_PLACE, own_texts())
    assert not found, "\n".join(found)


def test_no_path_of_one_machine_is_in_any_file() -> None:
    assert matches(r"(?<![\w.}])/(?:work|root|home|tmp)/\w|[C]:\\", own_texts()) == []


def test_no_file_name_needs_more_than_letters_digits_and_marks() -> None:
    assert [name for name in tracked() if not name.replace("/", "").isascii() or " " in name] == []
