"""The sentence of the Boundary sheet; masked, one for each reading."""

from __future__ import annotations

from app.model.boundary import BELOW, Crossed
from app.model.values import Absent, Estimate
from app.sheets.arms import label_of
from app.sheets.blocks import Line, Span
from app.sheets.further import harm_endpoint_name, is_harm_elsewhere
from app.sheets.words import CROSSED, NO_BREAK, Z, decimal, line, turned, z_number, z_places
from app.views.closed import ClosedView
from app.views.reading import Reading


def boundary_answer(view: ClosedView) -> tuple[Line, ...]:
    """One sentence; masked, one for each reading."""
    if isinstance(view.logrank, Absent):
        return (line(f"The test cannot be computed: {view.logrank.reason}."),)
    if not view.masked:
        return (_unmasked_sentence(view, view.readings[0]),)
    return tuple(_masked_sentence(view, reading) for reading in view.readings)


def _unmasked_sentence(view: ClosedView, reading: Reading) -> Line:
    bound = view.look.bound.efficacy_z
    z = _z_of(reading, bound)
    if reading.crossed_before(view.look.number):
        at = f" at look{NO_BREAK}{reading.verdict.first_crossed}. This look is over-running: "
        return line("The boundary was ", CROSSED, at, z, ", no second test.")
    if isinstance(bound, Absent) and reading.verdict.crossed == "harm":
        return line("The harm boundary was ", CROSSED, _below_against(view, reading))
    if isinstance(bound, Absent):
        return line("No efficacy boundary applies: ", z, f". {_reason(bound)}.")
    places = z_places(reading.z, bound)
    if reading.verdict.crossed == "efficacy":
        against_bound = line(": ", z, " against ", z_number(bound, places=places), ".")
        return line("The efficacy boundary was ", CROSSED, against_bound)
    if reading.verdict.crossed == "control":
        start = line("The boundary in favour of ", label_of(view, view.against).in_sentence, " was ", CROSSED)
        return line(start, ": ", z, " against ", turned(bound, places), ".")
    if reading.verdict.crossed in BELOW:
        return line(f"The {reading.verdict.crossed} boundary was ", CROSSED, _below_against(view, reading))
    if view.plan.design.sides == 2:
        both = Span(f"±{decimal(bound, places)}", value=bound)
        return line("No boundary was crossed: ", z, " against ", both, ".")
    return line(
        "The efficacy boundary was not crossed: ", z, " against ", z_number(bound, places=places), "."
    )


def _below_against(view: ClosedView, reading: Reading) -> Line:
    """ ": z 0.420 against 0.958." and, for futility that does not bind, that it does not."""
    crossed = reading.verdict.crossed
    bound = _bound_below(view, crossed)
    binds = crossed == "futility" and view.plan.futility is not None and view.plan.futility.binding
    advice = "." if binds or crossed == "harm" else "; it does not bind."
    if crossed == "harm" and is_harm_elsewhere(view):
        return line(f" on {harm_endpoint_name(view)}: ", _harm_against(reading, bound), ".")
    if bound is None or isinstance(bound, Absent):
        return line(".")
    return line(
        ": ", _z_of(reading, bound), " against ", z_number(bound, places=z_places(reading.z, bound)), advice
    )


def _bound_below(view: ClosedView, crossed: Crossed) -> Estimate | None:
    return view.look.bound.harm_z if crossed == "harm" else view.look.bound.futility_z


def _masked_sentence(view: ClosedView, reading: Reading) -> Line:
    bound = view.look.bound.efficacy_z
    start = line(f"If {reading.experimental} is experimental: ", _z_of(reading, bound))
    if reading.crossed_before(view.look.number):
        at = f" at look{NO_BREAK}{reading.verdict.first_crossed}; no second test."
        return line(start, ", the boundary was ", CROSSED, at)
    if reading.verdict.crossed in BELOW:
        return line(start, *_masked_below(view, reading))
    if isinstance(bound, Absent):
        return line(start, ", no efficacy boundary applies.")
    places = z_places(reading.z, bound)
    if reading.verdict.crossed == "efficacy":
        return line(start, ", efficacy bound ", z_number(bound, places=places), NO_BREAK, CROSSED, ".")
    if reading.verdict.crossed == "control":
        other = "B" if reading.experimental == "A" else "A"
        return line(start, ", bound ", turned(bound, places), f" in favour of {other} ", CROSSED, ".")
    if only_efficacy_counts(view):
        return line(start, ", efficacy bound ", z_number(bound, places=places), " not crossed.")
    return line(start, ", no boundary crossed.")


def only_efficacy_counts(view: ClosedView) -> bool:
    """Whether the plan has bounds below that a final look shows, but no longer judges by."""
    return view.look.final and (view.plan.futility is not None or view.plan.harm is not None)


def _masked_below(view: ClosedView, reading: Reading) -> Line:
    """ ", futility bound 0.958 crossed." """
    crossed = reading.verdict.crossed
    bound = _bound_below(view, crossed)
    if crossed == "harm" and is_harm_elsewhere(view):
        beside = _harm_against(reading, bound)
        return line(f", harm on {harm_endpoint_name(view)} ", CROSSED, ": ", beside, ".")
    shown = z_number(bound, places=z_places(reading.z, bound)) if bound is not None else Span("")
    return line(f", {crossed} bound ", shown, NO_BREAK, CROSSED, ".")


def _harm_against(reading: Reading, bound: Estimate | None) -> Line:
    """ "z -2.611 against -2.380", of harm's own endpoint."""
    if bound is None or isinstance(bound, Absent) or reading.z_for_harm is None:
        return ()
    places = z_places(reading.z_for_harm, bound)
    z = z_number(reading.z_for_harm, places=places)
    return line(Z, NO_BREAK, z, " against ", z_number(bound, places=places))


def _reason(bound: Absent) -> str:
    return bound.reason[:1].upper() + bound.reason[1:].rstrip(".")


def _z_of(reading: Reading, bound: Estimate) -> Line:
    return line(Z, NO_BREAK, z_number(reading.z, places=z_places(reading.z, bound)))
