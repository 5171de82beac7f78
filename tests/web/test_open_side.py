"""The open side learns nothing comparative: every byte of it is the same, whoever got which arm."""

from __future__ import annotations

import io
import re
import zipfile
from collections.abc import Callable, Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from fastapi.routing import iter_route_contexts

from app.actions import looks as actions
from app.actions.looks import assembled_look
from app.sheets.blocks import LookBook, Sheet
from app.sheets.words import line
from tests.unit.review.invented_trial import CONTROL, EXPERIMENTAL, held_before
from tests.unit.sheets.invented_looks import FURTHER
from tests.web.dealt import dealt, pooled_patients, serving
from tests.web.served import OWN, Served

EVENTS = "planned_events = 80"
EFFICACY = "[efficacy]\n"
LESS_KNOWN = f'[[held]]\nnumber = 2\nevents = 20\nsource = "C"\n{EFFICACY}'
LOOKS = (1, 2, 3)
SHEETS = ("glance", "data", "information", "curves", "boundary", "record")
Answer = tuple[int, tuple[tuple[str, str], ...], bytes]


def open_addresses(served: Served) -> Iterator[str]:
    """Every address under /open/ that the application knows, at each look and sheet; some that are none."""
    patterns = {str(route.path) for route in iter_route_contexts(served.app.routes)}
    for pattern in sorted(pattern for pattern in patterns if pattern.startswith("/open/")):
        for look in (*LOOKS, 9):
            for sheet in SHEETS if "{sheet}" in pattern else ("",):
                yield pattern.replace("{look}", str(look)).replace("{sheet}", sheet)
    yield from ("/", "/open", "/open/looks/x/data", "/static/nothing", "/enter/nothing")
    yield from ("/closed/looks/3/curves", "/closed/looks/3/record.json", "/closed/verify", "/closed/amend")


def everything_open(served: Served) -> dict[str, Answer]:
    """Status, headers and body of every answer that an open session can get."""
    served.enter("open")
    answers = {path: answer_of(served.get(path)) for path in dict.fromkeys(open_addresses(served))}
    for path in ("/closed/unmask", "/closed/receive", "/enter", "/open/looks/3/data"):
        posted = served.client.post(path, data={"key": "no"}, headers=OWN, follow_redirects=False)
        answers[f"POST {path}"] = answer_of(posted)
    return answers


def answer_of(response: Any) -> Answer:
    return response.status_code, tuple(sorted(response.headers.items())), response.content


@pytest.fixture(scope="module")
def same_pooled_data(tmp_path_factory: pytest.TempPathFactory) -> dict[str, dict[str, Answer]]:
    """What the open side gets of trials of one ratio and another, dealt to the same patients."""
    people = pooled_patients()
    trials = {
        "ratio 1": dealt(people, 1.0, seed=1),
        "ratio 1, dealt again": dealt(people, 1.0, seed=2),
        "ratio 0.3": dealt(people, 0.3, seed=3),
        "ratio 0.3, arms exchanged": dealt(people, 0.3, seed=3).with_arms_exchanged(),
    }
    folder = tmp_path_factory.mktemp("dealt")
    found = {}
    for name, trial in trials.items():
        with serving(folder / name.replace(" ", "-"), trial) as served:
            found[name] = everything_open(served)
    return found


def test_the_trials_do_differ_on_the_closed_side(tmp_path: Path) -> None:
    ratios = []
    for number, ratio in enumerate((1.0, 0.3)):
        with serving(tmp_path / str(number), dealt(pooled_patients(), ratio, seed=3)) as served:
            cox = assembled_look(served.desk, 3).result.cox
            ratios.append(cox.hazard_ratio)  # type: ignore[union-attr]
    assert 0.7 < ratios[0] < 1.4
    assert 0.2 < ratios[1] < 0.45


def test_every_open_answer_is_the_same_whoever_got_which_arm(
    same_pooled_data: dict[str, dict[str, Answer]],
) -> None:
    first, *others = same_pooled_data.values()
    assert len(first) > 80
    assert {200, 303, 403, 404, 405} <= {status for status, _, _ in first.values()}
    for other in others:
        assert differing(first, other) == []


def differing(one: dict[str, Answer], other: dict[str, Answer]) -> list[str]:
    assert one.keys() == other.keys()
    return [path for path in one if one[path] != other[path]]


def test_open_pages_figures_tables_and_reports_are_among_what_was_compared(
    same_pooled_data: dict[str, dict[str, Answer]],
) -> None:
    answers = same_pooled_data["ratio 0.3"]
    for path in (
        "/open/looks/3/glance",
        "/open/looks/3/curves/figure.json",
        "/open/looks/3/data/tables.zip",
        "/open/looks/3/report",
    ):
        assert answers[path][0] == 200
    assert answers["/open/looks/9/data"][0] == 404
    assert answers["/closed/looks/3/curves"][0] == 403


def test_no_open_answer_names_an_arm_a_digest_or_the_history(
    same_pooled_data: dict[str, dict[str, Answer]],
) -> None:
    for path, (_, headers, body) in same_pooled_data["ratio 0.3"].items():
        said = without_faces(body) + repr(headers)
        for word in (CONTROL, EXPERIMENTAL, CONTROL.lower(), EXPERIMENTAL.lower(), "Arm A", "hazard ratio"):
            assert word not in said, (path, word)
        assert not re.search(r"[0-9a-f]{40}|SHA-256|[Cc]hain head|\bentr(y|ies)\b", said), path


def without_faces(body: bytes) -> str:
    """The text of an answer; the faces inside a report are not text, and archives are unpacked."""
    if body.startswith(b"PK"):
        with zipfile.ZipFile(io.BytesIO(body)) as archive:
            return "".join(name + archive.read(name).decode() for name in archive.namelist())
    text = body.decode("utf-8").replace("\u00a0", " ")
    return re.sub(r"base64,[A-Za-z0-9+/=]+|sha256-[A-Za-z0-9+/=]+", "", text)


# --- planted leaks ------------------------------------------------------------------------------------


def count_by_arm(served: Served, number: int, book: LookBook) -> LookBook:
    """One open page tells the events of one arm."""
    events = assembled_look(served.desk, number).result.information.experimental.events
    glance, *others = book.sheets
    leaking = replace(glance, notes=(*glance.notes, line(f"{events} events")))
    return replace(book, sheets=(leaking, *others))


def order_by_arm(served: Served, number: int, book: LookBook) -> LookBook:
    """Rows of a table stand in an order that depends on which arm has more events."""
    information = assembled_look(served.desk, number).result.information
    turned = information.experimental.events > information.control.events
    return replace(book, sheets=tuple(map(turned_over, book.sheets))) if turned else book


def turned_over(sheet: Sheet) -> Sheet:
    return replace(sheet, tables=tuple(replace(table, rows=table.rows[::-1]) for table in sheet.tables))


@pytest.mark.parametrize("leak", [count_by_arm, order_by_arm])
def test_a_planted_leak_is_noticed(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, leak: Callable[[Served, int, LookBook], LookBook]
) -> None:
    people = dealt(pooled_patients(), 0.3, seed=3)
    found, honest = [], actions.open_book
    for name, trial in (("one", people), ("other", people.with_arms_exchanged())):
        with serving(tmp_path / name, trial) as served, monkeypatch.context() as leaking:
            for module in ("app.web.routes.looks", "app.actions.open_report"):
                leaking.setattr(
                    f"{module}.open_book",
                    lambda desk, look, served=served: leak(served, look, honest(desk, look)),
                )
            found.append(everything_open(served))
    leaked = differing(*found)
    assert any(path.startswith("/open/looks/3/") for path in leaked)
    assert "/open/looks/3/report" in leaked


def test_a_pooled_count_that_changes_changes_the_open_pages(
    tmp_path: Path, same_pooled_data: dict[str, dict[str, Answer]]
) -> None:
    people = dealt(pooled_patients(), 1.0, seed=1)
    time = people.time.copy()
    time[np.argmax(people.time)] = 10.0  # one more early event
    with serving(tmp_path, replace(people, time=time)) as served:
        changed = differing(same_pooled_data["ratio 1"], everything_open(served))
    for sheet in ("glance", "data", "information", "curves"):
        assert f"/open/looks/3/{sheet}" in changed
    assert "/open/looks/3/report" in changed
    assert "/closed/looks/3/curves" not in changed


def test_what_was_compared_at_looks_held_before_changes_nothing_on_the_open_side(tmp_path: Path) -> None:
    """The same events; another z, bound, alpha and source."""
    people = dealt(pooled_patients(), 1.0, seed=1)
    found = []
    for name, before in (
        ("one", held_before(1.5, -0.25)),
        ("other", held_before(-3.0, 3.9, source="Pelletol ahead")),
        ("less known", (EFFICACY, '[[held]]\nnumber = 1\nevents = 10\nsource = "C"\n' + LESS_KNOWN)),
    ):
        with serving(tmp_path / name, people, looks=1, changes=(before,)) as served:
            found.append(everything_open(served))
    assert found[0]["/open/looks/3/glance"][0] == 200
    assert b"held before" in found[0]["/open/looks/3/glance"][2]
    for other in found[1:]:
        assert differing(found[0], other) == []


def test_harm_crossed_or_not_and_a_hypothesis_tested_or_waiting_change_nothing_on_the_open_side(
    tmp_path: Path,
) -> None:
    """Nor does it tell that the closed side asked what if."""
    found, stand = [], []
    for ratio in (0.2, 1.0, 4.0):
        people = dealt(pooled_patients(), ratio, seed=3)
        with serving(tmp_path / str(ratio), people, changes=(FURTHER,)) as served:
            result = assembled_look(served.desk, 3).result
            crossed = {past.crossed for past in result.past}
            stand.append((*sorted(crossed - {"none"}), result.hypotheses[0].result.verdict.first_crossed))
            if ratio > 1.0:
                served.enter("closed")
                assert served.get("/closed/looks/3/outlook?hazard_ratio=0.8").status_code == 200
            found.append(everything_open(served))
    assert stand == [("efficacy", 2), (None,), ("harm", None)]
    for other in found[1:]:
        assert differing(found[0], other) == []
    for path, (_, _, body) in found[0].items():
        assert not re.search(r"[Dd]eath|DEATH|\b[Hh]arm\b|[Hh]ypothesis", without_faces(body)), path


def test_where_information_is_score_variance_the_open_side_does_not_depend_on_it(tmp_path: Path) -> None:
    by_variance = f'{EVENTS}\ninformation = "score variance"\nplanned_score_variance = 20.0'
    people, found = dealt(pooled_patients(), 0.3, seed=3), []
    for name, trial in (("one", people), ("other", dealt(pooled_patients(), 3.0, seed=4))):
        with serving(tmp_path / name, trial, looks=2, changes=((EVENTS, by_variance),)) as served:
            found.append(everything_open(served))
    assert b"Information by events" in found[0]["/open/looks/2/glance"][2]
    assert differing(*found) == []


def test_unmasking_and_what_is_recorded_later_change_nothing_on_the_open_side(tmp_path: Path) -> None:
    with serving(tmp_path, dealt(pooled_patients(), 0.3, seed=3)) as served:
        before = everything_open(served)
        served.enter("closed")
        served.post("/closed/unmask", by="M. Berg", reason="Asked for.")
        served.post(
            "/closed/recommend",
            advice="stop for benefit",
            look="2",
            held_on="2025-11-05",
            reason="As minuted.",
            by="M. Berg",
        )
        served.post("/closed/erratum", entry="1", correction="None.", by="M. Berg")
        assert [entry.kind for entry in served.desk.trial.entries()][-2:] == ["recommendation", "erratum"]
        assert served.desk.trial.state().unmasked
        assert differing(before, everything_open(served)) == []
