"""No rule applied to the masked pages and their JSON guesses which arm is experimental better than a coin.

Fifty trials, each strongly one-sided, for the experimental arm in about half of them and for control in the
others; the letters are drawn for each. A rule sees every masked page, figure and record of a look and names
the letter that it takes for the experimental arm. The rules tried are RULES.
"""

from __future__ import annotations

import hashlib
import json
import random
import re
from collections.abc import Callable
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import pytest

from app.actions.looks import looks
from tests.unit.review.invented_trial import CONTROL, EXPERIMENTAL, held_before
from tests.unit.sheets.invented_looks import FURTHER
from tests.web.dealt import dealt, pooled_patients, serving
from tests.web.served import Served

N_TRIALS = 50
FEWEST, MOST = 11, 39
"""Beyond these a fair coin falls in one of 40,000 times on either side (binomial, 50 throws)."""

HELD_Z = 2.123
Further = tuple[dict[str, Any], dict[str, Any], list[dict[str, Any]]]
SHEETS = ("glance", "data", "information", "curves", "boundary", "shape", "record")


@dataclass(frozen=True)
class Seen:
    """What somebody who may see the masked pages sees of one look."""

    pages: dict[str, str]
    record: dict[str, Any]

    @property
    def look(self) -> dict[str, Any]:
        return self.record["looks"][0]

    @property
    def all_pages(self) -> str:
        return "".join(self.pages.values())

    def arm(self, letter: str, part: str) -> dict[str, Any]:
        of = self.look[part] if part == "curves" else self.look["information"]["arms"]
        return next(arm for arm in of if arm["arm"] == letter)


def lower(value: Callable[[Seen, str], Any]) -> Callable[[Seen], str]:
    """The letter with the lower value; A when they are equal."""
    return lambda seen: "B" if value(seen, "B") < value(seen, "A") else "A"


def is_a(holds: Callable[[Seen], bool]) -> Callable[[Seen], str]:
    return lambda seen: "A" if holds(seen) else "B"


def last_digit(value: object) -> int:
    return int((re.findall(r"\d", repr(value)) or ["0"])[-1])


def plan_s_z(seen: Seen) -> float:
    """The z that the record has of a look held before, by arm; 1 where it has none."""
    known = [held["z"] for held in seen.record["held"] or ()] + [past["z"] for past in seen.look["history"]]
    return next((z for z in known if z is not None), 1.0)


def further(seen: Seen) -> Further:
    """What the record has of the first further hypothesis, of harm's endpoint and of both readings."""
    look = seen.look
    return look["hypotheses"][0], look["harm_endpoint"], look["readings"]


def odd(text: str) -> bool:
    return hashlib.sha256(text.encode()).digest()[0] % 2 == 1


RULES: dict[str, Callable[[Seen], str]] = {
    "always A": lambda seen: "A",
    "the arm with fewer events": lower(lambda seen, arm: seen.arm(arm, "information")["events"]),
    "the arm with fewer subjects": lower(lambda seen, arm: seen.arm(arm, "information")["subjects"]),
    "the arm with less person-time": lower(lambda seen, arm: seen.arm(arm, "information")["person_time"]),
    "the arm whose curve ends lower": lower(lambda seen, arm: seen.arm(arm, "curves")["survival"][-1]),
    "the arm with fewer distinct times": lower(lambda seen, arm: len(seen.arm(arm, "curves")["time"])),
    "the arm with the longer decimal expansion": lower(
        lambda seen, arm: -len(repr(seen.arm(arm, "curves")["survival"]))
    ),
    "the arm with the lower last digit": lower(
        lambda seen, arm: last_digit(seen.arm(arm, "curves")["survival"][-1])
    ),
    "the arm that the record orients by": lambda seen: seen.record["orientation"]["of"],
    "the arm that the statistic favours": is_a(lambda seen: seen.look["logrank"]["z"] > 0),
    "the arm with the lower hazard": is_a(lambda seen: seen.look["cox"]["hazard_ratio"] < 1),
    "the last digit of z": is_a(lambda seen: last_digit(seen.look["logrank"]["z"]) % 2 == 1),
    "the last digit of the hazard ratio": is_a(
        lambda seen: last_digit(seen.look["cox"]["hazard_ratio"]) % 2 == 1
    ),
    "the last digits of observed and expected": is_a(
        lambda seen: (
            last_digit(seen.look["logrank"]["observed"]) < last_digit(seen.look["logrank"]["expected"])
        )
    ),
    "whether the two readings mirror each other to the last bit": is_a(
        lambda seen: seen.look["readings"][0]["z"] == -seen.look["readings"][1]["z"]
    ),
    "the reading that crosses": is_a(lambda seen: seen.look["readings"][0]["crossed"] != "none"),
    "the reading with the smaller p": is_a(
        lambda seen: seen.look["readings"][0]["p_one_sided"] < seen.look["readings"][1]["p_one_sided"]
    ),
    "the letter named first on the page of curves": is_a(
        lambda seen: seen.pages["curves"].find("arm\u00a0A") < seen.pages["curves"].find("arm\u00a0B")
    ),
    "the letter named more often": is_a(
        lambda seen: (
            len(re.findall(r"[Aa]rm\W*A\b", seen.all_pages))
            > len(re.findall(r"[Aa]rm\W*B\b", seen.all_pages))
        )
    ),
    "the letter that is drawn last": is_a(
        lambda seen: seen.pages["curves"].rfind("arm-a") > seen.pages["curves"].rfind("arm-b")
    ),
    "the sign of a z that the plan has of a look held before": is_a(
        lambda seen: plan_s_z(seen) * seen.look["logrank"]["z"] > 0
    ),
    "the length of the pages": is_a(lambda seen: len(seen.all_pages) % 2 == 1),
    "the length of the record": is_a(lambda seen: len(json.dumps(seen.record)) % 2 == 1),
    "a digest of the pages": is_a(lambda seen: odd(seen.all_pages)),
    "a digest of the record": is_a(lambda seen: odd(json.dumps(seen.look))),
}


RULES_OF_FURTHER_ENDPOINTS: dict[str, Callable[[Further], bool]] = {
    "the arm with fewer deaths": lambda of: (
        of[0]["information"]["arms"][0]["events"] < of[0]["information"]["arms"][1]["events"]
    ),
    "the arm with less person-time until death": lambda of: (
        of[1]["arms"][0]["person_time"] < of[1]["arms"][1]["person_time"]
    ),
    "the sign of z of the hypothesis": lambda of: of[0]["logrank"]["z"] > 0,
    "the sign of z of harm": lambda of: of[1]["logrank"]["z"] > 0,
    "the reading in which harm is crossed": lambda of: of[2][0]["crossed"] == "harm",
    "the reading in which the hypothesis waits": lambda of: of[0]["readings"][0]["waits_for"] is not None,
    "the reading in which the hypothesis is crossed": lambda of: (
        of[0]["readings"][0]["crossed"] == "efficacy"
    ),
    "the last digits of both z of harm": lambda of: (
        last_digit(of[2][0]["z_for_harm"]) > last_digit(of[1]["logrank"]["z"])
    ),
    "the last digit of the expected deaths": lambda of: last_digit(of[1]["logrank"]["expected"]) % 2 == 1,
    "which stratum stands first": lambda of: (
        of[0]["logrank"]["strata"][0]["observed"] < of[0]["logrank"]["strata"][1]["observed"]
    ),
    "a digest of the hypothesis": lambda of: odd(json.dumps(of[0])),
    "a digest of harm": lambda of: odd(json.dumps(of[1])),
}


def seen_by(served: Served, look: int) -> Seen:
    served.enter()
    addresses = {sheet: f"/closed/looks/{look}/{sheet}" for sheet in SHEETS}
    addresses |= {
        f"{sheet} figure": f"/closed/looks/{look}/{sheet}/figure.json"
        for sheet in ("curves", "boundary", "shape")
    }
    addresses["ratio over time"] = f"/closed/looks/{look}/shape/second-figure.json"
    addresses["what if"] = f"/closed/looks/{look}/outlook?hazard_ratio=0.7"
    pages = {name: served.get(address).text for name, address in addresses.items()}
    record = json.loads(served.get(f"/closed/looks/{look}/record.json").text)
    return Seen(pages, record)


@pytest.fixture(scope="module", params=[False, True], ids=["looks of its own", "a look held before"])
def trials(
    request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory
) -> list[tuple[Seen, str]]:
    """What is seen of each trial, and the letter that its experimental arm truly has.

    A look held before had a z that points the same way as the patients do.
    """
    held = {0.2: (held_before(HELD_Z),), 5.0: (held_before(-HELD_Z),)} if request.param else {}
    return fifty_trials(tmp_path_factory.mktemp("masked"), held)


@pytest.fixture(scope="module")
def further_trials(tmp_path_factory: pytest.TempPathFactory) -> list[tuple[Seen, str]]:
    """The same with harm judged on death, and death as a further hypothesis."""
    return fifty_trials(tmp_path_factory.mktemp("further"), {0.2: (FURTHER,), 5.0: (FURTHER,)})


def fifty_trials(folder: Path, changes: dict[float, tuple[tuple[str, str], ...]]) -> list[tuple[Seen, str]]:
    """One look of each trial; `changes` are those of the plan by the hazard ratio of the patients."""
    chance, found = random.Random(5), []
    for number in range(N_TRIALS):
        ratio, deal, seed = chance.choice((0.2, 5.0)), chance.randrange(10**6), chance.randrange(10**6)
        people, changed = dealt(pooled_patients(100), ratio, seed=deal), changes.get(ratio, ())
        with serving(folder / str(number), people, looks=1, seed=seed, changes=changed) as served:
            key = served.desk.trial.letter_key().letters.experimental
            found.append((seen_by(served, served.desk.trial.state().first_number), key))
    return found


@pytest.mark.slow
def test_the_trials_are_strongly_one_sided_and_their_letters_fall_both_ways(
    trials: list[tuple[Seen, str]],
) -> None:
    assert all(abs(seen.look["logrank"]["z"]) > 1.5 for seen, _ in trials)
    assert FEWEST <= sum(letter == "A" for _, letter in trials) <= MOST
    for seen, _ in trials:
        assert CONTROL not in seen.all_pages
        assert EXPERIMENTAL not in seen.all_pages
        assert not re.search(rf"(?<![\d.]){HELD_Z}(?!\d)", seen.all_pages + json.dumps(seen.record))


@pytest.mark.slow
@pytest.mark.parametrize("rule", RULES)
def test_no_rule_guesses_the_key_better_than_a_coin(trials: list[tuple[Seen, str]], rule: str) -> None:
    hits = sum(RULES[rule](seen) == letter for seen, letter in trials)
    print(f"{rule}: {hits} of {len(trials)}")
    assert FEWEST <= hits <= MOST


@pytest.mark.slow
@pytest.mark.parametrize("rule", [*RULES, *RULES_OF_FURTHER_ENDPOINTS])
def test_no_rule_guesses_the_key_from_harm_or_a_further_hypothesis(
    further_trials: list[tuple[Seen, str]], rule: str
) -> None:
    guess = RULES.get(rule) or is_a(lambda seen: RULES_OF_FURTHER_ENDPOINTS[rule](further(seen)))
    hits = sum(guess(seen) == letter for seen, letter in further_trials)
    print(f"{rule}: {hits} of {len(further_trials)}")
    assert FEWEST <= hits <= MOST


@pytest.mark.slow
def test_further_endpoints_are_told_and_point_one_way(further_trials: list[tuple[Seen, str]]) -> None:
    for seen, _ in further_trials:
        _, harm, readings = further(seen)
        assert abs(harm["logrank"]["z"]) == abs(readings[0]["z_for_harm"])
        assert "Death" in seen.pages["boundary"]
        assert CONTROL not in seen.all_pages
        assert EXPERIMENTAL not in seen.all_pages
    crossed = [{reading["crossed"] for reading in further(seen)[2]} for seen, _ in further_trials]
    assert sum("harm" in each for each in crossed) > N_TRIALS // 2


@pytest.mark.slow
def test_a_record_that_gave_the_key_away_would_be_noticed(trials: list[tuple[Seen, str]]) -> None:
    """A planted leak: the record is oriented of the experimental arm, whatever its letter."""
    rule = RULES["the arm that the record orients by"]
    leaking = [
        (replace(seen, record={**seen.record, "orientation": {"of": letter}}), letter)
        for seen, letter in trials
    ]
    assert sum(rule(seen) == letter for seen, letter in leaking) > MOST


@pytest.mark.slow
def test_a_record_that_kept_the_z_of_a_held_look_would_be_noticed(tmp_path: Path) -> None:
    """A planted leak: the plan's z stands in the masked record; its sign beside A against B names the arm."""
    rule = RULES["the sign of a z that the plan has of a look held before"]
    for seed, ratio in enumerate((0.2, 5.0, 0.2, 5.0)):
        people, z = dealt(pooled_patients(100), ratio, seed=seed), HELD_Z if ratio < 1 else -HELD_Z
        with serving(tmp_path / str(seed), people, looks=1, seed=seed, changes=(held_before(z),)) as served:
            seen, key = seen_by(served, 2), served.desk.trial.letter_key().letters.experimental
        leaking = {**seen.record, "held": [{**seen.record["held"][0], "z": z}]}
        assert rule(replace(seen, record=leaking)) == key


@pytest.mark.parametrize(
    "changes",
    [(), (held_before(1.5, -0.25),), (FURTHER,)],
    ids=["looks of its own", "looks held before", "further endpoints"],
)
def test_exchanged_arms_under_exchanged_letters_give_the_same_bytes(
    tmp_path: Path, changes: tuple[tuple[str, str], ...]
) -> None:
    """The pages depend on nothing but which patients are A: no rule whatever can do better than a coin."""
    people = dealt(pooled_patients(), 0.3, seed=3)
    found = {}
    for seed in range(17, 40):
        exchanged = seed > 17
        with serving(
            tmp_path / str(seed),
            people.with_arms_exchanged() if exchanged else people,
            looks=2,
            seed=seed,
            changes=changes,
        ) as served:
            letter = served.desk.trial.letter_key().letters.experimental
            if letter not in found:
                found[letter] = {look: seen_by(served, look) for look in looks(served.desk)}
        if len(found) == 2:
            break
    assert set(found) == {"A", "B"}
    for look in found["A"]:
        one, other = found["A"][look], found["B"][look]
        assert one.look == other.look
        for name in one.pages:
            assert without_digests(one.pages[name]) == without_digests(other.pages[name]), name


def without_digests(page: str) -> str:
    """Heads and digests differ with the file; they are random to whoever does not hold it."""
    return re.sub(r"[0-9a-f]{4} [0-9a-f]{4} … [0-9a-f]{4}", "digest", page)


def test_with_unequal_allocation_the_page_says_that_counts_identify_the_letters(tmp_path: Path) -> None:
    two_to_one = (("allocation = [1, 1]", "allocation = [1, 2]"),)
    with serving(tmp_path, pooled_patients(), looks=1, changes=two_to_one) as served:
        served.enter()
        page = served.get("/closed/looks/1/information").text
    assert "The plan allocates 1:2 (control : experimental): the numbers of subjects identify the" in page
