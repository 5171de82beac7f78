"""The letters are drawn fairly and committed to without being given away."""

from __future__ import annotations

import json
import random
from hashlib import sha256

from app.ledger.entries import history_lines
from app.ledger.letters import draw_letters
from app.ledger.trial import Trial


def test_each_arm_is_a_as_often_as_b() -> None:
    draw = random.Random(5).randbytes
    n_draws = 4000
    n_control_is_a = sum(draw_letters(draw).letters.control == "A" for _ in range(n_draws))
    assert abs(n_control_is_a - n_draws / 2) < 4 * (n_draws / 4) ** 0.5  # four standard deviations


def test_two_arms_never_share_a_letter() -> None:
    draw = random.Random(6).randbytes
    drawn = {draw_letters(draw).letters for _ in range(100)}
    assert {(letters.control, letters.experimental) for letters in drawn} == {("A", "B"), ("B", "A")}


def test_the_commitment_can_be_checked_by_hand() -> None:
    key = draw_letters(random.Random(7).randbytes)
    letters = {"control": key.letters.control, "experimental": key.letters.experimental}
    text = json.dumps({"letters": letters, "salt": key.salt}, sort_keys=True, separators=(",", ":"))
    assert key.commitment == sha256(text.encode()).hexdigest()
    assert len(bytes.fromhex(key.salt)) == 32


def test_the_exported_history_holds_neither_letters_nor_salt_before_unmasking(trial: Trial) -> None:
    exported = history_lines(trial.entries())
    assert trial.letter_key().salt.encode() not in exported
    assert b"experimental" not in exported
    assert trial.letter_key().commitment.encode() in exported


def test_the_key_is_not_among_the_contents(lived: Trial) -> None:
    sealed = lived.letter_key().sealed
    assert lived._database.run("SELECT digest FROM content WHERE bytes = ?", sealed) == []
