"""Sheet 4, Boundary: where does the test stand?"""

from __future__ import annotations

from app.model.values import Absent
from app.sheets.blocks import Line, Sheet, Span
from app.sheets.boundary_answer import boundary_answer
from app.sheets.boundary_figure import boundary_figure, looks_table, side_words
from app.sheets.boundary_tables import folded_score, standing_tables, strata_table
from app.sheets.further import harm_table, hypothesis_details, is_harm_elsewhere, waiting_note
from app.sheets.held import held_tables, held_words
from app.sheets.methods import methods, spending_key
from app.sheets.words import count, line, listed
from app.views.closed import ClosedView

QUESTION = "Where does the test stand?"
FINAL_WORDS = (
    " A final look spends all alpha that is left; "
    "ending early because of comparative results does not release it."
)


def boundary_sheet(view: ClosedView) -> Sheet:
    return Sheet(
        key="boundary",
        number=4,
        name="Boundary",
        question=QUESTION,
        answer=boundary_answer(view),
        figure=boundary_figure(view),
        tables=standing_tables(view),
        folded=(
            *held_tables(view, side_words(view)),
            *hypothesis_details(view),
            *harm_table(view),
            *folded_score(view),
            *strata_table(view),
        ),
        notes=(_note(view),),
        methods=methods(
            "logrank",
            spending_key(view.plan.efficacy.spending),
            "boundary",
            *(key for key in ("futility", "harm") if getattr(view.plan, key) is not None),
            *(("hypotheses",) if view.hypotheses else ()),
            "bound-hazard-ratio",
            "repeated-interval",
            "cox",
            masked=view.masked,
        ),
        figure_table=looks_table(view),
    )


def _on_another_scale(view: ClosedView) -> bool:
    """Whether a past look's fraction, as used, is of another total than the plan has now."""
    planned = view.look.information.planned_events
    return any(abs(held.events / planned - held.fraction) > 1e-9 for held in view.look.past)


def _note(view: ClosedView) -> Line:
    lanes = "Left lanes: if A is experimental; right: if B. "
    start = lanes if boundary_figure(view).layout == "two lanes" else ""
    past = [str(held.number) for held in view.look.past if not isinstance(held.efficacy_z, Absent)]
    used = "bounds and fractions" if _on_another_scale(view) else "bounds"
    as_used = f" Look{'s' if len(past) > 1 else ''} {listed(past)}: {used} as used." if past else ""
    return line(
        f"{start}{_grey_words(view)}{_hatched_words(view)} Dotted: a guide; bounds exist at looks.{as_used}",
        *_ahead_words(view),
        _no_bound_words(view),
        held_words(view),
        FINAL_WORDS if view.look.final and view.look.information.fraction < 1 else "",
        waiting_note(view),
    )


def _grey_words(view: ClosedView) -> str:
    if view.plan.harm is None or is_harm_elsewhere(view):
        return "Grey: beyond the efficacy bound."
    across = "at the other end" if view.masked else "below"
    return f"Grey: beyond efficacy; {across}, harm."


def _hatched_words(view: ClosedView) -> str:
    if view.plan.futility is None:
        return ""
    return f" Hatched: futility, {'binding' if view.plan.futility.binding else 'not binding'}."


def _no_bound_words(view: ClosedView) -> str:
    """Why a dash stands in place of a bound."""
    held = [(each.number, each.efficacy_z) for each in view.readings[0].history]
    bounds = [*held, (view.look.number, view.look.bound.efficacy_z)]
    return "".join(f" Look {look}: {bound.reason}." for look, bound in bounds if isinstance(bound, Absent))


def _ahead_words(view: ClosedView) -> tuple[Span, ...]:
    if view.is_over:
        return ()
    spans: list[Span] = []
    for bound in view.look.planned:
        events = count(bound.events)
        spans += [Span(f" Look {bound.number}: if held at "), events, Span(" events.")]
    return tuple(spans)
