"""A process whose children act on one trial file, one after the other, each until it is killed.

Run as `python killed_at_random.py FILE N SEED`. A child opens the file and carries out one act after the
other, saying the digest of each act's entry through a pipe once the act is done. Its parent kills it at a
random moment, in the middle of whatever that meets: opening, undoing what the child before left, an act, a
backup. The next child goes on with the file as it was left. Prints a JSON line for each child: the digests
that it said, and all that a reader then finds.
"""

from __future__ import annotations

import json
import os
import random
import signal
import sys
import time
from collections.abc import Callable
from itertools import count
from pathlib import Path

from app.ledger.trial import Act, Trial
from tests.ledger import acts

MOST_ACTS = 4


def main(path: Path, n_children: int, seed: int) -> None:
    chance = random.Random(seed)
    acts.start(path, acts.ticking_settings()).close()
    for number in range(n_children):
        said = one_life(path, chance, number)
        with Trial.open(path, acts.ticking_settings()) as trial:
            problems = [str(problem) for problem in trial.check_chain()]
            there = [entry.digest for entry in trial.entries()]
        print(json.dumps({"said": said, "there": there, "problems": problems}))


def one_life(path: Path, chance: random.Random, number: int) -> list[str]:
    """What a child had said when it was killed: some acts after it began, at any moment of the next."""
    reader, writer = os.pipe()
    began = time.monotonic()
    child = os.fork()
    if child == 0:
        act_until_killed(path, random.Random(number), writer)
    os.close(writer)
    n_acts = chance.randint(0, MOST_ACTS)
    with os.fdopen(reader) as words:
        said = [words.readline() for _ in range(n_acts)]
        one_act = (time.monotonic() - began) / n_acts if n_acts else 0.02
        time.sleep(chance.uniform(0, 1.5 * one_act))
        os.kill(child, signal.SIGKILL)
        if not os.WIFSIGNALED(os.waitpid(child, 0)[1]):
            raise SystemExit("a child ended by itself")
        return [line.strip() for line in (*said, *words) if line.endswith("\n")]


def act_until_killed(path: Path, chance: random.Random, writer: int) -> None:
    try:
        with Trial.open(path, acts.ticking_settings()) as trial:
            for number in count():
                act_once(trial, chance, f"{os.getpid()} {number}")
                os.write(writer, trial.head().encode() + b"\n")
    finally:
        os._exit(1)  # never back into the parent's code


def act_once(trial: Trial, chance: random.Random, name: str) -> None:
    if chance.random() < 0.1:
        trial.back_up(trial.path.with_name(f"{name}.backup"), by="M. Berg")
        return
    with trial.act() as act:
        chance.choice(possible(act, name))(act)


def possible(act: Act, name: str) -> list[Callable[[Act], object]]:
    """The acts that history allows here."""
    look, frozen = act.state.open_look, act.state.frozen_looks
    deeds: list[Callable[[Act], object]] = [
        acts.amend,
        acts.record_refusal,
        acts.correct,
        acts.record_verification,
    ]
    if look is None:
        deeds.append(lambda act: acts.receive(act, act.state.next_number))
    else:
        deeds.append(lambda act: acts.open_results(act, look.number, session=name))
        deeds.append(lambda act: acts.freeze(act, look.number))
    if frozen:
        deeds.append(lambda act: acts.recommend(act, frozen[-1].number))
        deeds.append(lambda act: acts.write_report(act, frozen[-1].number))
    return deeds


if __name__ == "__main__":
    main(Path(sys.argv[1]), int(sys.argv[2]), int(sys.argv[3]))
