"""The Record sheet: the state in a sentence, the history in words, what can be done from here."""

from __future__ import annotations

from dataclasses import replace

from app.ledger.bodies import (
    ArmsUnmasked,
    Body,
    DoubtAnswered,
    FindingKept,
    LookFrozen,
    PlanLocked,
    ReportWritten,
    ResultsOpened,
    SnapshotReceived,
    Verification,
)
from app.ledger.history import Frozen, Head, Look, PlanVersion, State
from app.ledger.letters import Letters
from app.sheets.blocks import Sheet
from app.sheets.record import Freezing, History, grouped, record_sheet, said
from tests.unit.sheets.invented_looks import answers, table_texts

DIGEST = "8c4177d0" + "0" * 52 + "19e2"


def received(number: int, doubts: int = 0) -> SnapshotReceived:
    reasons = tuple(DoubtAnswered(f"doubt-{each}", "Known") for each in range(doubts))
    found = tuple(FindingKept(each.finding, "doubt", 1, "A doubt.") for each in reasons)
    return SnapshotReceived(number, "planned", f"2025-0{number}-01", None, (), found, reasons, "M. Berg")


def frozen(number: int) -> Frozen:
    body = LookFrozen(number, DIGEST, DIGEST, "masked", DIGEST, {}, "M. Berg")
    return Frozen(body, "2025-09-09T10:30:00Z", Head(9, DIGEST))


LOCKED = PlanVersion(1, DIGEST, entry=1, at="2025-01-01T08:00:00Z", by="M. Berg")


def history(
    looks: int, frozen_looks: int, *, unmasked: bool = False, freezing: Freezing | None = None
) -> History:
    on_file = tuple(
        Look(
            received(number),
            "2025-09-01T09:00:00Z",
            LOCKED,
            frozen(number) if number <= frozen_looks else None,
        )
        for number in range(1, looks + 1)
    )
    letters = Letters("A", "B") if unmasked else None
    state = State(
        head=Head(12, DIGEST),
        locked_at="2025-01-01T08:00:00Z",
        locked_by="M. Berg",
        plans=(LOCKED,),
        looks=on_file,
        letters=letters,
    )
    return History(state, (), freezing)


def sheet(looks: int, frozen_looks: int, number: int, **further: object) -> Sheet:
    return record_sheet(history(looks, frozen_looks, **further), number)  # type: ignore[arg-type]


def test_the_state_of_every_look_is_a_sentence() -> None:
    assert answers(sheet(1, 0, 1)) == ["Look 1 is open. The arms are masked."]
    assert answers(sheet(2, 1, 2)) == ["Look 2 is open; look 1 is frozen. The arms are masked."]
    assert answers(sheet(4, 3, 4, unmasked=True)) == [
        "Look 4 is open; looks 1, 2 and 3 are frozen. The arms are unmasked."
    ]
    assert answers(sheet(2, 1, 1)) == [
        "Look 1 was frozen on 9 Sep 2025, 10:30 UTC, by M. Berg. The arms are masked."
    ]


def test_in_its_own_report_a_look_is_frozen_already_and_nothing_can_be_done() -> None:
    freezing = Freezing("2025-10-01T11:00:00Z", "J. Ro", DIGEST, "masked")
    shown = sheet(2, 1, 2, freezing=freezing)
    assert answers(shown) == ["Look 2 was frozen on 1 Oct 2025, 11:00 UTC, by J. Ro. The arms are masked."]
    assert shown.acts == ()
    assert table_texts(shown, "Look 2")["Head before the freeze"] == ["8c41 77d0 … 19e2"]


def test_what_can_be_done_depends_on_what_was_done() -> None:
    def acts(of: Sheet) -> list[str]:
        return [act.path for act in of.acts]

    always = ["amend", "erratum", "backup", "verify"]
    assert acts(sheet(1, 0, 1)) == ["receive", *always, "looks/1/freeze", "unmask"]
    assert acts(sheet(2, 1, 2)) == ["receive", "recommend", *always, "looks/2/freeze", "unmask"]
    assert acts(sheet(2, 1, 1)) == [
        "looks/1/report",
        "looks/1/report.zip",
        "receive",
        "recommend",
        *always,
        "unmask",
    ]
    assert "unmask" not in acts(sheet(2, 1, 2, unmasked=True))


CUTOFF = "1\u00a0Feb\u00a02025"


def test_each_kind_of_entry_is_said_in_words() -> None:
    words: dict[str, Body] = {
        "Plan locked for trial Q17": PlanLocked("Q17", "", DIGEST, DIGEST, "M. Berg"),
        f"Snapshot 2 received for a planned look, cutoff {CUTOFF}": received(2),
        f"Snapshot 2 received for a planned look, cutoff {CUTOFF}, 1 doubt answered": received(2, doubts=1),
        f"Snapshot 2 received for a planned look, cutoff {CUTOFF}, 3 doubts answered": received(2, doubts=3),
        "Comparative results of look 2 opened, masked": ResultsOpened(2, "evening", "masked"),
        "Arms unmasked: Asked in session": ArmsUnmasked("Asked in session", Letters("A", "B"), "", "M. Berg"),
        "Look 2 frozen, masked": frozen(2).body,
        "Report of look 2 written": ReportWritten(2, DIGEST),
        "Verified up to entry 7": Verification(DIGEST, 7, 3, (1,)),
    }
    assert [said(body) for body in words.values()] == list(words)


def test_a_digest_is_shown_by_its_ends() -> None:
    assert grouped(DIGEST) == "8c41 77d0 … 19e2"


def test_one_answer_to_a_doubt_about_two_endpoints_answers_two() -> None:
    body = received(2, doubts=1)
    of_both = replace(body, findings=body.findings * 2)
    assert said(of_both).endswith(", 2 doubts answered")
