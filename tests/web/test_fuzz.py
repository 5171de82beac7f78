"""Whatever is sent, nobody meets a 500 and nothing is stored that was not confirmed."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.web.served import FOURTH_ANSWERS, OWN, Served, fourth_extract, serve_copy

POSTS = (
    "/enter",
    "/closed/receive",
    "/closed/receive/confirm",
    "/closed/receive/refusal",
    "/closed/unmask",
    "/closed/looks/3/freeze",
    "/closed/looks/2/freeze",
    "/closed/recommend",
    "/closed/erratum",
    "/closed/amend",
    "/closed/amend/confirm",
    "/closed/verify",
)
FIELDS = (
    "key",
    "cutoff",
    "extracted",
    "kind",
    "files",
    "token",
    "by",
    "reason",
    "freeze",
    "advice",
    "look",
    "held_on",
    "entry",
    "correction",
    "decided_by",
    "head",
    "plan",
    "reason-time-zero",
    "reason-",
)
GETS = (
    "/",
    "/enter/x",
    "/closed/receive",
    "/closed/receive/confirm",
    "/closed/unmask",
    "/closed/recommend",
    "/closed/erratum",
    "/closed/amend",
    "/closed/amend/confirm",
    "/closed/backup",
    "/closed/looks/{}/curves",
    "/closed/looks/3/{}",
    "/closed/looks/3/{}/figure.json",
    "/closed/looks/3/{}/second-figure.json",
    "/closed/looks/{}/record.json",
    "/closed/looks/{}/report",
    "/open/looks/{}/data",
    "/static/{}",
)
EXAMPLES = 150

anything = st.text(max_size=60)
forms = st.dictionaries(st.sampled_from(FIELDS) | st.text(min_size=1, max_size=10), anything, max_size=8)
kinds_of_body = st.sampled_from(
    (
        "application/x-www-form-urlencoded",
        "multipart/form-data; boundary=x",
        "multipart/form-data; boundary=x; charset=idna",
        "multipart/form-data; boundary=x; charset=utf-7",
        "multipart/form-data; boundary=x; charset=base64",
        "multipart/form-data",
        "multipart/form-data; boundary=",
        "application/json",
        "text/plain",
        "nonsense",
        "",
    )
)
parts = st.lists(
    st.sampled_from(
        (
            b"--x\r\n",
            b"--x--\r\n",
            b'Content-Disposition: form-data; name="files"; filename="a.csv"\r\n',
            b'Content-Disposition: form-data; name="cutoff"\r\n',
            b"Content-Disposition: form-data\r\n",
            b"Content-Type: text/csv\r\n",
            b"\r\n",
            b"2026-10-09\r\n",
            b"by=a&by=b&%ff=%00&token",
            b"\xff\xfe\x00",
        )
    )
    | st.binary(max_size=30),
    max_size=12,
).map(b"".join)


@pytest.fixture(scope="module")
def running(demo_trial: Path, tmp_path_factory: pytest.TempPathFactory) -> Iterator[Served]:
    served = serve_copy(demo_trial, tmp_path_factory.mktemp("fuzzed"))
    with served.client, served.desk:
        served.enter()
        yield served


@settings(max_examples=EXAMPLES)
@given(path=st.sampled_from(GETS), part=anything, query=anything)
def test_no_address_or_query_breaks_the_server(running: Served, path: str, part: str, query: str) -> None:
    response = running.client.get(path.replace("{}", quoted(part)), params={"look": query, query: part})
    assert response.status_code in (200, 303, 403, 404, 405, 409), response.text


def quoted(part: str) -> str:
    return "".join(f"%{byte:02x}" for byte in part.encode("utf-8", "surrogatepass"))


@settings(max_examples=EXAMPLES)
@given(path=st.sampled_from(POSTS), form=forms)
def test_no_form_breaks_the_server(running: Served, path: str, form: dict[str, str]) -> None:
    # a name and a reason would let the irrevocable acts through; whether they then work is tested elsewhere
    harmless = {name: text for name, text in form.items() if name not in ("by", "reason")}
    response = running.client.post(path, data=harmless, headers=OWN)
    assert response.status_code in (200, 403, 409, 422), response.text


@settings(max_examples=EXAMPLES)
@given(path=st.sampled_from(POSTS), kind=kinds_of_body, body=parts)
def test_no_body_breaks_the_server(running: Served, path: str, kind: str, body: bytes) -> None:
    response = running.client.post(path, content=body, headers={**OWN, "Content-Type": kind})
    assert response.status_code in (200, 400, 403, 409, 422), response.text


@pytest.mark.parametrize("charset", ["idna", "undefined", "utf-7", "utf-16", "latin-1"])
@pytest.mark.parametrize("field", ['name="cutoff"', 'name="files"; filename="xn--\xff"'])
def test_a_form_in_another_character_set_is_not_guessed_at(running: Served, charset: str, field: str) -> None:
    body = f"--x\r\nContent-Disposition: form-data; {field}\r\n\r\n+2AA-\r\n--x--\r\n".encode("latin-1")
    kind = f"multipart/form-data; boundary=x; charset={charset}"
    response = running.client.post("/closed/receive", content=body, headers={**OWN, "Content-Type": kind})
    assert (response.status_code, "another character set than UTF-8" in response.text) == (400, True)


@settings(max_examples=EXAMPLES // 3)
@given(name=anything, at=st.integers(0, 2000), piece=st.binary(min_size=1, max_size=40))
def test_no_damaged_extract_breaks_the_server_or_enters_the_trial_file(
    running: Served, name: str, at: int, piece: bytes
) -> None:
    before = running.path.read_bytes()
    content = fourth_extract()[:4000]
    damaged = content[:at] + piece + content[at + len(piece) :]
    response = running.upload(damaged, name=name or "x", **FOURTH_ANSWERS)
    assert response.status_code in (303, 400, 422), response.text
    assert running.path.read_bytes() == before
