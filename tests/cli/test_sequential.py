"""The group-sequential core through both commands: bounds, monitoring, outlook and stopping in the record.

Values marked so were computed independently: recursive quadrature of another author.
"""

from __future__ import annotations

import json
import math
import random
from collections.abc import Sequence
from pathlib import Path
from statistics import NormalDist
from typing import Any

import numpy as np
import pytest

from app.cli import main
from app.record.schema import BOUNDARY_RECORD, EVALUATION_RECORD, LOOKS_RECORD, differences
from app.survival import logrank

PLAN = """\
format = 1
[trial]
name = "Q17"
title = "An invented trial of tablet against placebo"
start_date = 2024-01-01
{trial}
[arms]
control = "PLACEBO"
experimental = "TABLET"
[endpoint]
parameter = "DEATHHF"
label = "Death or heart-failure admission"
[design]
alpha = 0.025
sides = 1
power = 0.9
hazard_ratio = 0.75
planned_events = 400
looks = [0.35, 0.7, 1.0]
{design}
[efficacy]
spending = {efficacy}
{tables}
"""
OBRIEN_FLEMING_TYPE = '"O\'Brien-Fleming-type"'
FUTILITY = '[futility]\nspending = "Hwang-Shih-DeCani"\nparameter = -3\n'
HARM = '[harm]\nspending = "Pocock-type"\nalpha = 0.025\n'


def plan(
    folder: Path,
    tables: str = "",
    *,
    efficacy: str = OBRIEN_FLEMING_TYPE,
    design: str = "",
    trial: str = "",
    **keys: object,
) -> Path:
    """A plan; `keys` replace lines of [design]."""
    text = PLAN.format(trial=trial, design=design, efficacy=efficacy, tables=tables)
    for key, value in keys.items():
        start = text.index(f"{key} = ")
        text = f"{text[:start]}{key} = {value}{text[text.index(chr(10), start) :]}"
    path = folder / "plan.toml"
    path.write_text(text, encoding="utf-8")
    return path


def extract(folder: Path, events: int, on_tablet: float = 0.46) -> Path:
    """800 subjects, of whom so many had the event, this share of them on tablet."""
    chance = random.Random(events)
    tablet, placebo = list(range(0, 800, 2)), list(range(1, 800, 2))
    chance.shuffle(tablet)
    chance.shuffle(placebo)
    first = round(events * on_tablet)
    with_event = {*tablet[:first], *placebo[: events - first]}
    lines = ["USUBJID,TRTP,PARAMCD,AVAL,CNSR"]
    for subject in range(800):
        arm = "PLACEBO" if subject % 2 else "TABLET"
        lines.append(
            f"S{subject:03},{arm},DEATHHF,{chance.randint(30, 900)},{int(subject not in with_event)}"
        )
    path = folder / f"adtte-{events}-{on_tablet}.csv"
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")
    return path


def record(capsys: pytest.CaptureFixture[str], *arguments: object) -> dict[str, Any]:
    assert main([*map(str, arguments), "--json"]) == 0
    printed: dict[str, Any] = json.loads(capsys.readouterr().out)
    shape = BOUNDARY_RECORD if arguments[0] == "boundary" else EVALUATION_RECORD
    assert list(differences(printed, shape)) == []
    return printed


def evaluated(capsys: pytest.CaptureFixture[str], plan: Path, *looks: object) -> list[dict[str, Any]]:
    found: list[dict[str, Any]] = record(capsys, "evaluate", plan, *looks)["looks"]
    return found


def bounds(looks: list[dict[str, Any]], name: str = "efficacy_z") -> list[Any]:
    return [look.get("boundary", look)[name] for look in looks]


def test_harm_and_futility_stand_beside_efficacy(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """REFERENCES: non-binding O'Brien-Fleming-type futility at three equal looks; computed independently."""
    futility = '[futility]\nspending = "O\'Brien-Fleming-type"\n'
    thirds = "[0.3333333333333333, 0.6666666666666666, 1.0]"
    found = record(capsys, "boundary", plan(tmp_path, futility, looks=thirds))
    assert bounds(found["looks"]) == pytest.approx([3.7103, 2.5114, 1.9930], abs=5e-5)
    assert bounds(found["looks"], "futility_z") == pytest.approx([-0.6945, 1.0025, 1.9930], abs=5e-5)
    assert found["noncentrality"] == pytest.approx(3.33639, abs=5e-6)
    assert found["inflation"] == pytest.approx(1.0594, abs=5e-5)
    obeyed = sum(look["efficacy"] for look in found["crossing_probability"]["null"])
    assert obeyed == pytest.approx(0.02331, abs=5e-6)
    quarters = record(capsys, "boundary", plan(tmp_path, HARM, looks="[0.25, 0.5, 0.75, 1.0]"))
    assert bounds(quarters["looks"], "harm_z") == pytest.approx(
        [-2.3683, -2.3675, -2.3582, -2.3500], abs=5e-5
    )


@pytest.mark.parametrize(
    ("efficacy", "last"),
    [('"Haybittle-Peto"\ninterim_z = 3.0', 1.975), ('"Wang-Tsiatis"\nshape = 0.25', 2.136)],
)
def test_fixed_families_end_at_their_published_bound(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], efficacy: str, last: float
) -> None:
    """Two-sided 0.05: Haybittle-Peto at three looks; Wang-Tsiatis at five (Jennison & Turnbull 2000)."""
    looks = (
        "[0.2, 0.4, 0.6, 0.8, 1.0]" if "Wang" in efficacy else "[0.3333333333333333, 0.6666666666666666, 1]"
    )
    path = plan(tmp_path, efficacy=efficacy, alpha=0.05, sides=2, looks=looks)
    assert record(capsys, "boundary", path)["looks"][-1]["efficacy_z"] == pytest.approx(last, abs=5e-4)


def test_futility_leaves_the_efficacy_bounds_of_looks_as_they_were(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    looks = [part for events in (140, 280, 400) for part in ("--look", extract(tmp_path, events))]
    found = evaluated(capsys, plan(tmp_path, FUTILITY + HARM), *looks)
    assert bounds(found) == pytest.approx([3.6128, 2.4406, 2.0002], abs=5e-5)  # computed independently
    assert found[-1]["boundary"]["futility_z"] == found[-1]["boundary"]["efficacy_z"]
    assert [look["boundary"]["harm_alpha_spent"] for look in found][-1] == 0.025


def test_a_safety_look_between_changes_nothing_later(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    first, safety, *rest = [("--look", extract(tmp_path, events)) for events in (140, 200, 280, 400)]
    path = plan(tmp_path)
    plain = evaluated(capsys, path, *first, *(part for look in rest for part in look))
    with_it = evaluated(
        capsys, path, *first, *safety, "--kind", "safety", *(part for look in rest for part in look)
    )
    assert [bounds(plain)[at] for at in (0, 1, 2)] == [bounds(with_it)[at] for at in (0, 2, 3)]
    assert "safety look" in with_it[1]["boundary"]["efficacy_z"]["not_estimable"]


HELD = """\
[[held]]
number = 1
events = 140
z = 1.1
efficacy_z = 3.6127887364322664
alpha_spent = 0.00015146075051096218
source = "Charter table 2"
[[held]]
number = 2
events = 280
z = 1.4
efficacy_z = 2.4405756926559357
alpha_spent = 0.007384489357694457
source = "Charter table 2"
"""


def test_a_revised_total_keeps_the_bounds_used_and_the_information_recorded(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """Held at 140 and 280 of 400 events; total raised to 520; look at 390 (computed independently)."""
    path = plan(tmp_path, HELD, planned_events=520)
    found = record(capsys, "evaluate", path, "--look", extract(tmp_path, 390))
    (look,) = found["looks"]
    assert look["number"] == 3
    assert bounds(look["history"]) == pytest.approx([3.6128, 2.4406], abs=5e-5)
    assert look["boundary"]["efficacy_z"] == pytest.approx(2.6006, abs=5e-5)
    assert [held["source"] for held in found["held"]] == ["Charter table 2"] * 2
    assert found["held"][0]["computed_efficacy_z"] == pytest.approx(4.1642, abs=5e-5)
    assert found["held"][0]["difference"] == pytest.approx(3.6128 - 4.1642, abs=1e-4)


def test_a_held_look_that_crossed_ends_the_test(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = plan(tmp_path, HELD.replace("z = 1.4", "z = 2.5", 1))
    (look,) = evaluated(capsys, path, "--look", extract(tmp_path, 400))
    assert look["boundary"]["first_crossed"] == 2
    assert "over-running" in look["boundary"]["efficacy_z"]["not_estimable"]
    assert "over-running" in look["stopping"]["not_estimable"]


BY = ("--by", "A. Person")
UNMASKED = ('experimental = "TABLET"', 'experimental = "TABLET"\nmasked = false')


def done(*arguments: object) -> None:
    assert main([*map(str, arguments)]) == 0


def unmasked(path: Path) -> Path:
    path.write_text(path.read_text().replace(*UNMASKED))
    return path


def in_a_trial_file(folder: Path, locked: Path, *events: int, amended: Path | None = None) -> dict[str, Any]:
    """Locked, amended, extracts received and frozen one after the other; the record of the last report."""
    trial = folder / "q17.trial"
    done("start", locked, trial, *BY)
    if amended is not None:
        done("amend", trial, amended, "--reason", "Fewer events than foreseen", *BY)
    for number, n_events in enumerate(events, 3):
        done("receive", trial, extract(folder, n_events), "--cutoff", f"2026-0{number}-01", *BY)
        done("freeze", trial, *BY)
    done("verify", trial)
    done("report", trial, 2 + len(events), "--to", folder)
    done("verify", folder)
    (written,) = folder.glob("*.record.json")
    found: dict[str, Any] = json.loads(written.read_text())
    assert list(differences(found, LOOKS_RECORD)) == []
    return found


def test_held_looks_in_a_trial_file_are_used_as_evaluate_uses_them(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """The example above through a trial file: the same record, and the look after it rests on all three."""
    path = unmasked(plan(tmp_path, HELD, planned_events=520))
    looks = ("--look", extract(tmp_path, 390), "--look", extract(tmp_path, 470))
    evaluated_ = record(capsys, "evaluate", path, *looks)
    found = in_a_trial_file(tmp_path, path, 390, 470)
    (look,) = found["looks"]
    assert bounds(look["history"]) == pytest.approx([3.6128, 2.4406, 2.6006], abs=5e-5)
    assert found["held"] == evaluated_["held"]
    last = evaluated_["looks"][1]
    assert last["outlook"]["conditional_power"].pop("chosen") is None  # no record that is kept has it
    for part in ("history", "boundary", "ahead", "outlook", "repeated_interval", "stopping"):
        assert look[part] == last[part]


@pytest.mark.parametrize("alpha_recorded", [True, False])
def test_a_total_revised_by_amendment_leaves_held_looks_as_they_were_locked(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], alpha_recorded: bool
) -> None:
    """Locked with 400 planned events and held looks at 0.35 and 0.7 of them; amended to 520; look at 390."""
    lines = HELD.splitlines(keepends=True)
    held = "".join(line for line in lines if alpha_recorded or not line.startswith("alpha_spent"))
    locked = unmasked(plan(tmp_path, held)).rename(tmp_path / "locked.toml")
    amended = unmasked(plan(tmp_path, held, planned_events=520))
    found = in_a_trial_file(tmp_path, locked, 390, amended=amended)
    (look,) = found["looks"]
    assert bounds(look["history"]) == pytest.approx([3.6128, 2.4406], abs=5e-5)
    assert [past["fraction"] for past in look["history"]] == [0.35, 0.7]
    assert look["boundary"]["efficacy_z"] == pytest.approx(2.6006, abs=5e-5)
    assert [held["difference"] for held in found["held"]] == pytest.approx([0.0, 0.0], abs=1e-9)


def test_a_held_look_that_crossed_starts_unmasked_and_leaves_over_running(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    crossed = plan(tmp_path, HELD.replace("z = 1.4", "z = 2.5", 1))
    trial = tmp_path / "q17.trial"
    assert main([*map(str, ("start", crossed, trial, *BY))]) == 2
    assert capsys.readouterr().err.strip() == (
        "A held look that crossed its bound would give the arm letters away in plan.toml, [[held]]. "
        "Found look 2 beyond its efficacy_z, and arms that start masked. "
        "Accepted: masked = false in [arms], or held looks of which none crossed. "
        "Write masked = false, or correct the held look."
    )
    assert not trial.exists()
    (look,) = in_a_trial_file(tmp_path, unmasked(crossed), 400)["looks"]
    assert (look["boundary"]["crossed"], look["boundary"]["first_crossed"]) == ("none", 2)
    assert "over-running" in look["boundary"]["efficacy_z"]["not_estimable"]


def test_a_look_held_before_the_file_has_no_report_there(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    in_a_trial_file(tmp_path, plan(tmp_path, HELD, planned_events=520), 390)
    capsys.readouterr()
    assert main(["report", str(tmp_path / "q17.trial"), "1", "--to", str(tmp_path)]) == 4
    assert capsys.readouterr().err.strip() == (
        "Look 1 was held before this trial file. "
        "Found no snapshot of it, and so no sheets, freeze or report. Accepted: look 3 or a later one. "
        "Read what is known of it in the plan, under [[held]]."
    )


def test_alpha_by_the_calendar_goes_by_the_cutoff(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    trial, design = "planned_end_date = 2028-01-01", 'spending_clock = "calendar"'
    path = plan(tmp_path, trial=trial, design=design)
    (look,) = evaluated(capsys, path, "--look", extract(tmp_path, 140), "--cutoff", "2026-01-01")
    share = 731 / 1461  # days gone over days planned
    assert look["boundary"]["information_fraction"] == 0.35
    assert main(["evaluate", str(path), "--look", str(extract(tmp_path, 140))]) == 2
    assert "No data cutoff although alpha is spent by the calendar in look 1" in capsys.readouterr().err
    by_events = evaluated(capsys, plan(tmp_path, planned_events=1461), "--look", extract(tmp_path, 731))
    assert by_events[0]["boundary"]["information_fraction"] == share
    assert look["boundary"]["alpha_spent"] == by_events[0]["boundary"]["alpha_spent"]


def test_information_may_be_the_score_variance(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = plan(tmp_path, design='information = "score variance"\nplanned_score_variance = 98.0')
    (look,) = evaluated(capsys, path, "--look", extract(tmp_path, 140))
    variance = look["logrank"]["variance"]
    assert look["boundary"]["information"] == variance
    assert look["boundary"]["information_fraction"] == pytest.approx(variance / 98.0, rel=1e-14)
    assert main(["evaluate", str(path), "--look", str(extract(tmp_path, 140))]) == 0
    assert f"information fraction {variance / 98.0:.3f} by score variance\n" in capsys.readouterr().out


def test_going_on_is_told_while_looks_are_to_come_and_ending_when_it_ends(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    analysis = "[analysis]\nprior_hazard_ratio = 0.8\nprior_std_error = 0.2\n"
    path = plan(tmp_path, FUTILITY + analysis)
    looks = [part for events in (140, 280, 400) for part in ("--look", extract(tmp_path, events))]
    first, second, last = evaluated(capsys, path, *looks)
    power = first["outlook"]["conditional_power"]["design"]
    assert power["final_look"] < power["path"]
    assert power["path_futility_obeyed"] < power["path"]
    assert first["outlook"]["criterion"] == first["ahead"][-1]["efficacy_z"]
    assert 0.0 < first["outlook"]["predictive_power"]["prior"] < 1.0
    assert second["outlook"]["next_look"]["events"] == 400
    assert first["stopping"] is second["stopping"] is None
    assert "no planned look" in last["outlook"]["not_estimable"]
    assert last["stopping"]["ci_low"] < last["stopping"]["median_unbiased_hazard_ratio"]
    assert last["repeated_interval"]["level"] == pytest.approx(0.95)


@pytest.mark.parametrize(
    ("on_tablet", "crossed", "first"), [(0.58, "futility", None), (0.66, "harm", None), (0.3, "efficacy", 1)]
)
def test_what_is_crossed_is_named_and_only_efficacy_ends_the_test(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], on_tablet: float, crossed: str, first: int | None
) -> None:
    path = plan(tmp_path, FUTILITY + HARM)
    looks = ["--look", extract(tmp_path, 140, on_tablet), "--look", extract(tmp_path, 280, on_tablet)]
    found = evaluated(capsys, path, *looks)
    assert (found[0]["boundary"]["crossed"], found[0]["boundary"]["first_crossed"]) == (crossed, first)
    assert (found[0]["stopping"] is not None) == (crossed != "none")
    tested = "not_estimable" not in (found[1]["boundary"]["efficacy_z"] if first else {})
    assert tested == (first is None)


def test_a_power_that_the_events_do_not_have_is_a_doubt(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    found = record(capsys, "boundary", plan(tmp_path))
    assert [doubt["id"] for doubt in found["findings"]] == ["power-reached"]
    assert found["power_reached"] < 0.83
    assert found["fixed_design_events"]["schoenfeld"] == pytest.approx(507.84, abs=5e-3)
    enough = record(capsys, "boundary", plan(tmp_path, planned_events=found["events_needed"]))
    assert enough["findings"] == []
    assert enough["power_reached"] == pytest.approx(0.9, abs=1e-3)


def test_locking_and_amending_tell_a_power_that_the_events_do_not_have_and_go_on(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    trial = tmp_path / "q17.trial"
    done("start", plan(tmp_path), trial, *BY)
    told = capsys.readouterr()
    assert told.err.startswith("doubt power-reached: Hazard ratio, events and power disagree in the plan, ")
    assert "Locked plan.toml" in told.out
    needed = record(capsys, "boundary", plan(tmp_path))["events_needed"]
    done("amend", trial, plan(tmp_path, planned_events=needed), "--reason", "Enough events", *BY)
    assert capsys.readouterr().err == ""
    done("amend", trial, plan(tmp_path, planned_events=300), "--reason", "Too few", *BY)
    told = capsys.readouterr()
    assert "with 300 events at hazard ratio 0.75" in told.err
    assert "Plan version 3 governs" in told.out


def test_the_text_shows_futility_harm_and_the_outlook(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = plan(tmp_path, FUTILITY + HARM)
    assert main(["boundary", str(path)]) == 0
    printed = capsys.readouterr()
    assert "Futility as z" in printed.out
    assert "Harm as z" in printed.out
    assert "doubt power-reached: Hazard ratio, events and power disagree" in printed.err
    assert main(["evaluate", str(path), "--look", str(extract(tmp_path, 140))]) == 0
    assert "Conditional power along the planned looks: " in capsys.readouterr().out
    assert main(["evaluate", str(path), "--look", str(extract(tmp_path, 400))]) == 0
    assert "Ending here: one-sided p " in capsys.readouterr().out


# --- what if ----------------------------------------------------------------------------------------------


def test_a_chosen_hazard_ratio_has_its_conditional_power_at_each_look(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """The plan's own ratio gives the very numbers of the design; the final look is the closed formula."""
    of, looks = plan(tmp_path, FUTILITY), ("--look", extract(tmp_path, 140), "--look", extract(tmp_path, 280))
    for look in evaluated(capsys, of, *looks, "--hazard-ratio", "0.75"):
        power = look["outlook"]["conditional_power"]
        assert power["chosen"] == power["design"]
    for look in evaluated(capsys, of, *looks, "--hazard-ratio", "0,8"):
        t, z = look["information"]["fraction"], look["logrank"]["z"]
        drift = -math.log(0.8) * math.sqrt(400 * 0.25)
        score = z * math.sqrt(t) + drift * (1 - t) - look["outlook"]["criterion"]
        chosen = look["outlook"]["conditional_power"]["chosen"]
        assert chosen["final_look"] == pytest.approx(NormalDist().cdf(score / math.sqrt(1 - t)), abs=1e-12)
        assert chosen.keys() == {"hazard_ratio", "final_look", "path", "path_futility_obeyed"}
        assert chosen["path_futility_obeyed"] <= chosen["path"]


def test_without_a_chosen_ratio_its_place_is_null(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (look,) = evaluated(capsys, plan(tmp_path), "--look", extract(tmp_path, 140))
    assert look["outlook"]["conditional_power"]["chosen"] is None


def test_at_a_final_look_a_chosen_ratio_asks_in_vain(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    (look,) = evaluated(
        capsys, plan(tmp_path), "--look", extract(tmp_path, 400), "--kind", "final", "--hazard-ratio", "0.8"
    )
    assert look["outlook"] == {"not_estimable": "no planned look is to come"}


def test_the_chosen_ratio_is_said_as_a_question(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    look = str(extract(tmp_path, 140))
    assert main(["evaluate", str(plan(tmp_path)), "--look", look, "--hazard-ratio", "0.8"]) == 0
    assert "% (null), " in (printed := capsys.readouterr().out)
    assert "% (what if the hazard ratio were 0.800).\n" in printed


@pytest.mark.parametrize(
    ("options", "said"),
    [
        (
            ("0",),
            "A hazard ratio lies out of bounds in --hazard-ratio. Found '0'. Accepted: a number from 0.05",
        ),
        (("half",), "This is no hazard ratio in --hazard-ratio. Found 'half'. Accepted: a number from 0.05"),
        (
            ("0.8", "--hazard-ratio", "0.9"),
            "An option is given twice in 'evaluate'. Found --hazard-ratio for a second time. Accepted: one "
            "for all looks. Run the command once for each.",
        ),
    ],
)
def test_what_is_no_ratio_or_two_is_refused_in_a_sentence(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], options: tuple[str, ...], said: str
) -> None:
    look = str(extract(tmp_path, 140))
    assert main(["evaluate", str(plan(tmp_path)), "--look", look, "--hazard-ratio", *options]) == 2
    assert said in capsys.readouterr().err


def two_endpoints(folder: Path, events: int, deaths: int, *, deaths_on_tablet: float = 0.46) -> Path:
    """The rows of one extract, and under DEATH those of another."""
    both = extract(folder, events).read_text(), extract(folder, deaths, deaths_on_tablet).read_text()
    rows = both[1].replace("DEATHHF", "DEATH").partition("\n")[2]
    path = folder / f"both-{events}-{deaths}-{deaths_on_tablet}.csv"
    path.write_text(both[0] + rows, encoding="utf-8")
    return path


DEATH = """\
[[hypothesis]]
name = "Death"
parameter = "DEATH"
label = "Death from any cause"
event_is = "bad"
after = "primary"
alpha = 0.025
planned_events = 200
efficacy = {spending = "O'Brien-Fleming-type"}
"""


def test_harm_on_another_endpoint_and_a_hypothesis_that_waits(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """Deaths at the plan's own fractions have the plan's own bounds: 3.6128, 2.4406, 2.0002, as above."""
    path = plan(tmp_path, HARM + 'parameter = "DEATH"\n' + DEATH)
    counts = ((140, 70), (280, 140), (400, 200))
    looks = [part for each in counts for part in ("--look", two_endpoints(tmp_path, *each))]
    found = evaluated(capsys, path, *looks)
    assert bounds(found) == pytest.approx([3.6128, 2.4406, 2.0002], abs=5e-5)
    deaths = [look["hypotheses"][0] for look in found]
    assert bounds(deaths) == pytest.approx([3.6128, 2.4406, 2.0002], abs=5e-5)
    assert [look["harm_endpoint"]["information"] for look in found] == [70, 140, 200]
    assert [look["harm_endpoint"]["logrank"]["z"] for look in found] == [
        look["logrank"]["z"] for look in deaths
    ]
    assert {death["boundary"]["waits_for"] for death in deaths} <= {"primary", None}
    printed = record(capsys, "boundary", path)
    assert bounds(printed["hypotheses"][0]["looks"]) == pytest.approx([3.6128, 2.4406, 2.0002], abs=5e-5)
    assert printed["alpha_of_all"] == 0.025


def test_harm_crosses_on_its_own_endpoint_while_the_plans_own_does_not(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = plan(tmp_path, HARM + 'parameter = "DEATH"\n')
    (look,) = evaluated(capsys, path, "--look", two_endpoints(tmp_path, 140, 100, deaths_on_tablet=0.75))
    assert look["boundary"]["crossed"] == "harm"
    assert look["boundary"]["first_crossed"] is None
    assert look["logrank"]["z"] > 0 > look["boundary"]["harm_z"] > look["harm_endpoint"]["logrank"]["z"]


def test_the_commands_say_what_waits(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = plan(tmp_path, HARM + 'parameter = "DEATH"\n' + DEATH)
    assert main(["evaluate", str(path), "--look", str(two_endpoints(tmp_path, 140, 70))]) == 0
    told = capsys.readouterr().out
    assert "Death: 70 of 200 planned events, z " in told
    assert "; waits for the plan's endpoint." in told
    assert ", z of DEATH " in told
    assert main(["boundary", str(path)]) == 0
    assert (
        "Death, one-sided alpha 0.0250, tested once the plan's endpoint has crossed"
        in capsys.readouterr().out
    )


# --- worked trials, their z reached by an extract made for it -------------------------------------------


def z_of(time: Any, event: Any, on_tablet: Any) -> float:
    return float(logrank(time, event, on_tablet).z)


def extract_with_z(folder: Path, events: int, z: float, subjects: int = 1000) -> Path:
    """An extract with so many events whose log-rank z is `z` to 3e-5: arms are exchanged until it is."""
    draw = np.random.default_rng(events)
    time = np.arange(1.0, subjects + 1)
    event = np.zeros(subjects, dtype=bool)
    event[draw.choice(subjects, events, replace=False)] = True
    arm = draw.permutation(np.arange(subjects) % 2 == 0)
    off = z_of(time, event, arm) - z
    while abs(off) > 3e-5:
        pair = [draw.choice(np.flatnonzero(arm)), draw.choice(np.flatnonzero(~arm))]
        arm[pair] = arm[pair[::-1]]
        moved = z_of(time, event, arm) - z
        if abs(moved) < max(abs(off), 0.01):  # wander near it rather than stay where no pair helps
            off = moved
        else:
            arm[pair] = arm[pair[::-1]]
    rows = [
        f"S{at:04},{'TABLET' if arm[at] else 'PLACEBO'},DEATHHF,{time[at]:g},{int(not event[at])}"
        for at in range(subjects)
    ]
    path = folder / f"z-{events}-{z}.csv"
    path.write_text("\n".join(["USUBJID,TRTP,PARAMCD,AVAL,CNSR", *rows]) + "\n", encoding="utf-8")
    return path


def held_tables(looks: Sequence[tuple[int, float, float]]) -> str:
    """Looks held before: events, z, and the bound used."""
    return "".join(
        f'[[held]]\nnumber = {number}\nevents = {events}\nz = {z}\nefficacy_z = {bound}\nsource = "print"\n'
        for number, (events, z, bound) in enumerate(looks, 1)
    )


def test_the_trial_of_a_beta_blocker_as_if_stopped_at_its_sixth_look(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """DeMets et al. (1984), Controlled Clinical Trials 5, 362: z and deaths at six looks, 628 deaths planned.

    The bounds used are O'Brien-Fleming's of seven looks. With the deaths as information a stop at the sixth
    has p 0.00957 and ratio 0.750 (0.597 to 0.953), computed independently.
    """
    deaths, z = (56, 77, 126, 177, 247), (1.68, 2.24, 2.37, 2.30, 2.34)
    tables = held_tables(tuple(zip(deaths, z, (5.459, 3.860, 3.152, 2.730, 2.441), strict=True)))
    path = plan(tmp_path, tables, alpha=0.05, sides=2, planned_events=628)
    (look,) = evaluated(
        capsys, path, "--look", extract_with_z(tmp_path, 318, 2.82, subjects=3800), "--kind", "final"
    )
    stop = look["stopping"]
    assert [each["z"] for each in look["history"]] == list(z)
    assert stop["p_one_sided"] == pytest.approx(0.00957, abs=5e-6)
    scale = math.sqrt(look["logrank"]["variance"] / (318 / 4))  # print has a quarter of the deaths for V
    ratios = [stop[name] ** scale for name in ("median_unbiased_hazard_ratio", "ci_low", "ci_high")]
    assert ratios == pytest.approx([0.750, 0.597, 0.953], abs=6e-4)


def test_its_bounds_by_deaths_through_boundary(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """O'Brien-Fleming-type spending of 0.025 a side by deaths of 628 and of 400 (computed independently)."""
    deaths = (56, 77, 126, 177, 247, 318)
    wanted = {
        628: [7.415, 6.294, 4.869, 4.065, 3.395, 2.964],
        400: [5.877, 4.977, 3.827, 3.182, 2.644, 2.305],
    }
    for total, bounds_ in wanted.items():
        path = plan(tmp_path, alpha=0.05, sides=2, planned_events=total)
        at = ",".join(str(each / total) for each in deaths)
        assert bounds(record(capsys, "boundary", path, "--at", at)["looks"]) == pytest.approx(
            bounds_, abs=6e-4
        )


@pytest.mark.parametrize(
    ("family", "before", "stage", "z", "p", "drift", "limits"),
    [
        ("O'Brien-Fleming", (4.5617, 3.2256), 3, 2.80, 0.002851, 3.5959, (1.0510, 6.1324)),
        ("Pocock", (2.4132,), 2, 2.70, 0.010175, 4.0736, (0.6833, 7.2575)),
    ],
)
def test_what_follows_a_stop_through_evaluate(
    tmp_path: Path,
    capsys: pytest.CaptureFixture[str],
    family: str,
    before: tuple[float, ...],
    stage: int,
    z: float,
    p: float,
    drift: float,
    limits: tuple[float, float],
) -> None:
    """Five equal looks of 100 events; computed independently, method of Tsiatis, Rosner & Mehta (1984)."""
    tables = held_tables([(100 * number, 0.0, bound) for number, bound in enumerate(before, 1)])
    looks = "[0.2, 0.4, 0.6, 0.8, 1.0]"
    path = plan(
        tmp_path, tables, efficacy=f'"{family}"', alpha=0.05, sides=2, looks=looks, planned_events=500
    )
    (look,) = evaluated(capsys, path, "--look", extract_with_z(tmp_path, 100 * stage, z))
    assert look["boundary"]["crossed"] == "efficacy"
    stop, variance = look["stopping"], look["logrank"]["variance"]

    def as_drift(ratio: float) -> float:
        """The mean of z at full information."""
        return -math.log(ratio) * math.sqrt(variance / (stage / 5))

    assert stop["p_one_sided"] == pytest.approx(p, abs=1e-6)
    assert as_drift(stop["median_unbiased_hazard_ratio"]) == pytest.approx(drift, abs=5e-4)
    assert sorted(map(as_drift, (stop["ci_low"], stop["ci_high"]))) == pytest.approx(limits, abs=5e-4)


@pytest.mark.parametrize(
    ("z", "t", "null", "trend", "design", "flat"),
    [
        (1.5, 0.5, 0.1017, 0.5903, 0.8462, 0.5641),
        (1.0, 0.5, 0.0382, 0.2201, 0.6986, 0.2926),
        (0.5, 0.5, 0.0115, 0.0382, 0.5081, 0.1051),
        (0.0, 0.5, 0.0028, 0.0028, 0.3157, 0.0250),
        (2.0, 0.3, 0.1507, 0.9784, 0.9534, 0.8659),
        (1.2, 0.75, 0.0328, 0.1254, 0.4127, 0.1599),
    ],
)
def test_evaluate_prints_the_conditional_power_of_worked_trials(
    tmp_path: Path,
    capsys: pytest.CaptureFixture[str],
    z: float,
    t: float,
    null: float,
    trend: float,
    design: float,
    flat: float,
) -> None:
    """One test at the end, against 1.95996; the design's effect has 90% power (computed independently)."""
    ratio = math.exp(-(1.959964 + 1.281552) / math.sqrt(400 / 4))
    path = plan(tmp_path, looks="[1.0]", hazard_ratio=ratio)
    (look,) = evaluated(
        capsys, path, "--look", extract_with_z(tmp_path, round(400 * t), z), "--kind", "safety"
    )
    outlook = look["outlook"]
    power = {
        effect: outlook["conditional_power"][effect]["final_look"] for effect in ("null", "trend", "design")
    }
    assert outlook["criterion"] == pytest.approx(1.95996, abs=5e-6)
    assert power == pytest.approx({"null": null, "trend": trend, "design": design}, abs=6e-5)
    assert outlook["predictive_power"]["flat"] == pytest.approx(flat, abs=6e-5)
