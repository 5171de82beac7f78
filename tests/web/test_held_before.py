"""The pages of a trial file whose plan has looks held before it."""

from __future__ import annotations

import re
from collections.abc import Iterator
from pathlib import Path

import pytest

from tests.unit.review.invented_trial import held_before, plan_text
from tests.web.dealt import dealt, pooled_patients, serving
from tests.web.served import OWN, Served

TWO_BEFORE = held_before(1.234, -0.567)


@pytest.fixture
def after_two(tmp_path: Path) -> Iterator[Served]:
    """Looks 1 and 2 held before; 3 frozen, 4 open."""
    with serving(tmp_path, dealt(pooled_patients(), 0.5, seed=3), looks=2, changes=(TWO_BEFORE,)) as served:
        served.enter()
        yield served


def spine(page: str) -> list[str]:
    """What stands at each look of the spine."""
    rail = page[page.index('<nav class="spine"') : page.index("</nav>", page.index('<nav class="spine"'))]
    return re.findall(r"<li class=.*?</li>", rail, re.DOTALL)


def words(item: str) -> str:
    return " ".join(re.sub(r"<[^>]+>", "", item).split())


def test_the_spine_leads_to_the_looks_of_this_file_and_only_says_those_of_before(after_two: Served) -> None:
    assert after_two.get("/").headers["location"] == "/closed/looks/4/glance"
    first, second, third, *_ = spine(after_two.get("/closed/looks/4/boundary").text)
    for item, events in ((first, 10), (second, 20)):
        assert 'class="mark"' in item
        assert "held before" in item
        assert "href" not in item
        assert 'title="Charter table 2"' in item
        assert f"{events} events" in words(item)
    assert words(second).endswith("held before this file, Charter table 2")
    assert 'href="/closed/looks/3/boundary"' in third


@pytest.mark.parametrize("path", ["glance", "boundary", "record.json", "report", "freeze"])
def test_a_look_held_before_has_no_address(after_two: Served, path: str) -> None:
    for number in (1, 2):
        answer = after_two.get(f"/closed/looks/{number}/{path}")
        assert answer.status_code == 404
    assert after_two.get("/closed/looks/3/report").status_code == 200


def test_a_plan_with_other_held_looks_is_refused_without_a_z_on_the_page(after_two: Served) -> None:
    plan = plan_text(held_before(1.5, -0.567))
    answer = after_two.client.post(
        "/closed/amend", files=[("files", ("plan-2.toml", plan, "application/toml"))], headers=OWN
    )
    assert answer.status_code == 422
    assert "Held looks cannot be amended, added or left out in plan-2.toml" in answer.text
    assert "1.234" not in answer.text


def test_unmasking_brings_the_z_of_looks_held_before_to_the_pages(after_two: Served) -> None:
    z = r"(?<![\d.])1\.234(?!\d)"
    assert not re.search(z, after_two.get("/closed/looks/4/boundary").text)
    after_two.post("/closed/unmask", by="M. Berg", reason="Asked for.")
    assert re.search(z, after_two.get("/closed/looks/4/boundary").text)


def test_the_open_side_says_events_and_no_source(after_two: Served) -> None:
    after_two.enter("open")
    page = after_two.get("/open/looks/4/information").text
    first, *_ = spine(page)
    assert "10 events" in words(first)
    assert "held before" in words(first)
    assert "Charter" not in page
    assert after_two.get("/open/looks/1/information").status_code == 404
