"""Tests that wait for another: a hypothesis is tested only at looks at which the one before it has crossed.

Its own bounds stand at every look, by its own spending function and its own information, whether or not it is
tested there; what they spend is never given back. So each hypothesis is tested at its own level within a
closed test, and no error is made by choosing when to open the gate.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from app.model.boundary import Bound, Crossed, LookAsUsed, Verdict
from app.model.plan import Hypothesis, Sides
from app.sequential.verdict import crossed, first_crossed, verdict

PRIMARY = "primary"


def opened_at(past: Sequence[LookAsUsed], here: Verdict, number: int, *, gate: int = 0) -> int | None:
    """The look that opens the gate for what waits: the first at which efficacy was crossed, None if none.

    `past` are the looks held, each with what it crossed; `here` is the verdict of look `number` after them. A
    crossing on the other side, of futility or of harm opens nothing, and none counts before this hypothesis's
    own gate was opened at look `gate`.
    """
    held = next((look.number for look in past if look.crossed == "efficacy"), None)
    first = number if held is None and here.crossed == "efficacy" else held
    return None if first is None else max(first, gate)


def gated_history(past: Sequence[LookAsUsed], opened: int | None, sides: Sides) -> tuple[LookAsUsed, ...]:
    """The looks held of a hypothesis that waits, each crossing decided anew.

    Before the gate opened none was tested, but a final one: after it there is no other test, so that once the
    gate is open it is the one that counts.
    """
    decided: list[LookAsUsed] = []
    for look in past:
        counts = opened is not None and (look.number >= opened or look.final)
        tested = counts and first_crossed(decided) is None
        here: Crossed = crossed(look.z, look, sides) if tested else "none"
        decided.append(replace(look, crossed=here))
    return tuple(decided)


def gated_verdict(
    past: Sequence[LookAsUsed], z: float | None, bound: Bound, sides: Sides, opened: int | None
) -> Verdict:
    """Where a hypothesis that has a gate stands at a look.

    Parameters
    ----------
    past : the looks held of this hypothesis, in order; what they say was crossed is decided anew
    z : of its own log-rank test here, positive in favour of experimental; None where there is none
    bound : its own bound here
    sides : 1, or 2 for a bound on either side
    opened : number of the look that opened the gate, this one or an earlier one; None while it waits

    Returns
    -------
    Verdict; nothing is crossed while it waits, and a first crossing stands.

    Notes
    -----
    *Convention*: a hypothesis whose z lay beyond its bound while it waited has not crossed; it is tested with
    what it holds at the look that opens the gate, and at those after. Where its final look came while it
    waited, that look decides once the gate is open: its own test has its level at every look, whenever the
    other is rejected.
    *Accuracy*: exact, stored numbers are compared.
    *Checked*: against the literal rule, and its error by simulation, in
    tests/unit/sequential/test_gatekeeping.py.

    References
    ----------
    Hung, Wang & O'Neill (2007), Journal of Biopharmaceutical Statistics 17, 1201-1210; Glimm, Maurer & Bretz
    (2010), Statistics in Medicine 29, 219-228; Tamhane, Mehta & Liu (2010), Biometrics 66, 1174-1184.
    """
    if opened is None:
        return Verdict("none", None)
    return verdict(gated_history(past, opened, sides), z, bound, sides)


def in_testing_order(hypotheses: Sequence[Hypothesis]) -> tuple[Hypothesis, ...]:
    """Each after the one that it waits for, else as the plan has them; names run in no circle."""
    done: dict[str, Hypothesis] = {}
    while len(done) < len(hypotheses):
        for each in hypotheses:
            if each.name not in done and each.after in {None, PRIMARY, *done}:
                done[each.name] = each
    return tuple(done.values())


def family_alpha(primary: float, hypotheses: Sequence[Hypothesis]) -> float:
    """The level at which all hypotheses together are tested.

    Parameters
    ----------
    primary : alpha of the plan's own endpoint, on the sides of the plan
    hypotheses : the further ones, each with its own alpha on the same sides; names run in no circle

    Returns
    -------
    float, alpha on the sides of the plan.

    Notes
    -----
    *Convention*: hypotheses side by side add up (Bonferroni); along a chain the larger counts, of a
    hypothesis and of all that wait for it, since the ones that wait are tested only where it was rejected.
    *Accuracy*: sums of the plan's alphas, to the last bits of a double.
    *Checked*: by hand (tests/unit/sequential/test_gatekeeping.py).

    References
    ----------
    Bonferroni's inequality; closed tests: Marcus, Peritz & Gabriel (1976), Biometrika 63, 655-660.
    """
    waiting = dict.fromkeys((PRIMARY, *(each.name for each in hypotheses)), 0.0)
    beside = 0.0  # from the ends of the chains on, so that what waits is complete when its turn comes
    for each in reversed(in_testing_order(hypotheses)):
        level = max(each.alpha, waiting[each.name])
        if each.after is None:
            beside += level
        else:
            waiting[each.after] += level
    return max(primary, waiting[PRIMARY]) + beside
