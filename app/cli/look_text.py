"""The looks of a record as a terminal shows them."""

from __future__ import annotations

from typing import Any

from app.cli import said
from app.cli.columns import aligned


def as_text(record: dict[str, Any]) -> str:
    """One block a look: who was counted, what the test says, where its bound stands."""
    return "\n".join(look_text(look, record["orientation"]) for look in record["looks"])


def look_text(look: dict[str, Any], orientation: dict[str, str]) -> str:
    information = look["information"]
    arms = [
        (
            arm["arm"],
            str(arm["subjects"]),
            str(arm["events"]),
            said.number(arm["person_time"], 0),
            median_of(look, arm),
        )
        for arm in information["arms"]
    ]
    heads = ("Arm", "Subjects", "Events", f"Time at risk, {look['time_unit']}", "Median time to event")
    by_information = ", final" if look["final"] and look["kind"] != "final" else ""
    return (
        f"Look {look['number']}, {look['kind']}{by_information}: "
        f"{information['events']} of {information['planned_events']} planned events, "
        f"information fraction {said.number(information['fraction'])}{counted_by(information)}\n\n"
        f"{aligned(heads, arms)}\n{test_text(look, orientation)}"
    )


def counted_by(information: dict[str, Any]) -> str:
    """Said where the fraction is not that of the events beside it."""
    by_events = information["events"] / information["planned_events"]
    return "" if information["fraction"] == by_events else " by score variance"


def median_of(look: dict[str, Any], arm: dict[str, Any]) -> str:
    curve = next(curve for curve in look["curves"] if curve["arm"] == arm["arm"])
    return said.number(curve["median"], 1)


def test_text(look: dict[str, Any], orientation: dict[str, str]) -> str:
    """The log-rank beside its bound, then the hazard ratio, each beside the same quantity at the bound."""
    bound = look["boundary"]
    cox = look["cox"]
    ratio = "not estimable" if "not_estimable" in cox else said.number(cox["hazard_ratio"])
    rows = [
        ("z of the log-rank test", z_of(look), said.bound(bound["efficacy_z"])),
        ("p, one-sided", *one_sided(look)),
        ("Hazard ratio", ratio, said.bound(bound["efficacy_hazard_ratio"])),
    ]
    heads = (f"{orientation['of']} against {orientation['against']}", "Observed", "Efficacy bound")
    said_of_it = verdict_text(look) + lower_bounds_text(look) + hypotheses_text(look) + outlook_text(look)
    return f"{aligned(heads, rows)}\n{said_of_it}"


def lower_bounds_text(look: dict[str, Any]) -> str:
    """Futility and harm, where the plan has them; harm beside its own z where that is another."""
    bound, harm = look["boundary"], look["harm_endpoint"]
    parts = [
        f"{kind.capitalize()} bound {said.bound(bound[f'{kind}_z'])}"
        for kind in ("futility", "harm")
        if bound[f"{kind}_z"] is not None
    ]
    if harm is not None:
        parts[-1] += f", z of {harm['parameter']} {z_of(harm)}"
    return f"{'. '.join(parts)}.\n" if parts else ""


def hypotheses_text(look: dict[str, Any]) -> str:
    return "".join(f"{hypothesis_text(each)}.\n" for each in look["hypotheses"] or ())


def hypothesis_text(hypothesis: dict[str, Any]) -> str:
    """ "Death: 142 of 300 planned events, z 1.703 against 3.065, alpha spent 0.00112; waits for primary"."""
    information, bound = hypothesis["information"], hypothesis["boundary"]
    counted = f"{information['events']} of {information['planned_events']} planned events"
    tested = f"z {z_of(hypothesis)} against {said.bound(bound['efficacy_z'])}"
    return (
        f"{hypothesis['name']}: {counted}, {tested}, alpha spent {said.alpha(bound['alpha_spent'])}; "
        f"{standing_text(bound)}"
    )


def standing_text(bound: dict[str, Any]) -> str:
    if bound["waits_for"] is not None:
        return f"waits for {said.hypothesis(bound['waits_for'])}"
    if bound["crossed"] != "none":
        return f"crossed: {bound['crossed']}"
    first = bound["first_crossed"]
    return "not crossed" if first is None else f"crossed at look {first}"


def outlook_text(look: dict[str, Any]) -> str:
    """Conditional power while looks are to come, and what ending here says where that was asked."""
    outlook, ended = look["outlook"], look["stopping"]
    lines = []
    if outlook is not None and "not_estimable" not in outlook:
        power = outlook["conditional_power"]
        effects = ("design", "trend", "null")
        shown = [f"{said.percent(power[effect]['path'])}% ({effect})" for effect in effects]
        if power["chosen"] is not None:
            ratio, path = said.number(power["chosen"]["hazard_ratio"]), said.percent(power["chosen"]["path"])
            shown.append(f"{path}% (what if the hazard ratio were {ratio})")
        lines.append(f"Conditional power along the planned looks: {', '.join(shown)}.\n")
    if ended is not None and "not_estimable" not in ended:
        ratio = said.number(ended["median_unbiased_hazard_ratio"])
        limits = f"{said.number(ended['ci_low'])} to {said.number(ended['ci_high'])}"
        p = said.p_value(ended["p_one_sided"])[0]
        lines.append(f"Ending here: one-sided p {p}, median-unbiased hazard ratio {ratio} ({limits}).\n")
    return "".join(lines)


def z_of(look: dict[str, Any]) -> str:
    test = look["logrank"]
    return "not estimable" if "not_estimable" in test else said.number(test["z"])


def one_sided(look: dict[str, Any]) -> tuple[str, str]:
    test, bound = look["logrank"], look["boundary"]["efficacy_p_one_sided"]
    seen = None if "not_estimable" in test else test["p_one_sided"]
    if seen is None:
        return "-", said.bound(bound, 4)
    if isinstance(bound, dict):
        return said.p_value(seen)[0], "-"
    observed, at_bound = said.p_value(seen, bound)
    return observed, at_bound


def not_crossed_text(look: dict[str, Any]) -> str:
    """At a final look no bound below is a test any more, so nothing is said of it."""
    bound = look["boundary"]
    has_bounds_below = bound["futility_z"] is not None or bound["harm_z"] is not None
    return "Efficacy was not crossed" if look["final"] and has_bounds_below else "No boundary was crossed"


def verdict_text(look: dict[str, Any]) -> str:
    bound = look["boundary"]
    first = bound["first_crossed"]
    crossed = not_crossed_text(look) if bound["crossed"] == "none" else f"Crossed: {bound['crossed']}"
    since = f"; first crossed at look {first}" if first is not None and first != look["number"] else ""
    return (
        f"{crossed}{since}. Alpha spent {said.alpha(bound['alpha_spent'])}, "
        f"{said.alpha(bound['alpha_spent_here'])} of it here.\n"
    )
