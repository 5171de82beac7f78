"""A plan is read key by key, and everything wrong in it is told at once."""

from __future__ import annotations

import hashlib
import re
from dataclasses import fields
from datetime import date
from unittest import mock

import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.errors import DesignInvalid
from app.intake.not_computed import NOT_COMPUTED
from app.intake.plan import PlanRefused, read_plan
from app.intake.plan_keys import FAMILIES, TABLES
from app.model.plan import Plan
from app.settings import Limits

SOUND = """\
format = 1
[trial]
name = "Q17"
title = "An invented trial of tablet against placebo"
start_date = 2024-03-01
[arms]
control = "PLACEBO"
experimental = "TABLET"
allocation = [1, 2]
masked = false
[endpoint]
parameter = "DEATHHF"
label = "Death or heart-failure admission"
event_is = "bad"
[columns]
strata = ["REGION", "PRIORHF"]
[design]
alpha = 0.025
sides = 1
power = 0.9
hazard_ratio = 0.75
planned_events = 533
looks = [0.35, 0.7, 1]
[efficacy]
spending = "O'Brien-Fleming-type"
[enrolment]
planned_subjects = 900
[analysis]
confidence = 0.9
"""


def read(text: str) -> Plan:
    return read_plan(text.encode(), name="q17.toml", limits=Limits())


def problems(text: str) -> list[str]:
    with pytest.raises(PlanRefused) as refusal:
        read(text)
    return [str(problem) for problem in refusal.value.problems]


def with_line(table: str, line: str) -> str:
    """The sound plan with a line more in a table, or in place of the line of the same key."""
    key = line.split(" = ")[0]
    text = re.sub(rf"(?m)(?<=\[{table}\]\n)((?:.+ = .+\n)*?){key} = .*\n", r"\1", SOUND)
    return text.replace(f"[{table}]\n", f"[{table}]\n{line}\n")


def test_every_part_of_a_sound_plan_arrives():
    plan = read(SOUND)
    assert plan.trial.start_date == date(2024, 3, 1)
    assert (plan.arms.control, plan.arms.allocation, plan.arms.masked) == ("PLACEBO", (1, 2), False)
    assert plan.endpoint.direction == 1
    assert plan.columns.strata == ("REGION", "PRIORHF")
    assert plan.columns.subject == "USUBJID"
    assert plan.design.looks == (0.35, 0.7, 1.0)
    assert plan.efficacy.spending == "O'Brien-Fleming-type"
    assert plan.enrolment.planned_subjects == 900
    assert plan.analysis.confidence == 0.9
    assert plan.futility is None


def test_the_digest_is_that_of_the_bytes():
    assert read(SOUND).digest == hashlib.sha256(SOUND.encode()).hexdigest()


def test_a_byte_order_mark_and_windows_line_ends_change_the_digest_only():
    content = b"\xef\xbb\xbf" + SOUND.replace("\n", "\r\n").encode()
    plan = read_plan(content, name="q17.toml", limits=Limits())
    assert plan.trial == read(SOUND).trial
    assert plan.digest == hashlib.sha256(content).hexdigest()


def test_the_tables_name_every_field_of_the_plan_classes():
    for key, table in TABLES.items():
        named = {table.field_names.get(each, each) for each in table.known}
        assert named == {field.name for field in fields(table.noun)}, key


@pytest.mark.parametrize(
    ("table", "line", "sentence"),
    [
        (
            "design",
            "powr = 0.9",
            "Unknown key 'powr' in q17.toml, table [design]. Accepted: alpha, sides, power, hazard_ratio, "
            "planned_events, looks, information, planned_score_variance, spending_clock, carry_on, "
            "safety_spend. Write 'power', the nearest known key, or remove it.",
        ),
        (
            "trial",
            "masked = true",
            "Unknown key 'masked' in q17.toml, table [trial]. Accepted: name, title, start_date, "
            "planned_end_date. Write 'name', the nearest known key, or move it to [arms], or remove it.",
        ),
        (
            "design",
            "non_inferiority_margin = 1.3",
            "A non-inferiority margin is not supported in q17.toml, table [design]. Found key "
            "'non_inferiority_margin'. Accepted: two arms, followed from randomisation, compared for "
            "superiority. Remove the key.",
        ),
        (
            "design",
            "power = 0.02",
            "Power not above alpha in q17.toml, table [design], key power. Found power 0.02 with alpha "
            "0.025. Accepted: a power above alpha and below 1. Correct power or alpha.",
        ),
        (
            "design",
            'alpha = "0.025"',
            "Alpha outside its domain in q17.toml, table [design], key alpha. Found '0.025'. Accepted: a "
            "number above 0 and below 0.5. Correct the value.",
        ),
        (
            "design",
            "looks = [0.35, 0.35, 1.0]",
            "Looks outside its domain in q17.toml, table [design], key looks. Found [0.35, 0.35, 1.0]. "
            "Accepted: a list of information fractions above 0, each larger than the one before, the last of "
            "them 1. Correct the value.",
        ),
        (
            "design",
            "hazard_ratio = 1.25",
            "The planned hazard ratio favours control in q17.toml, table [design], key hazard_ratio. Found "
            "1.25 with event_is 'bad'. Accepted: experimental / control, below 1 where the event is bad. "
            "Turn the ratio over, or correct event_is.",
        ),
        (
            "arms",
            'control = "TABLET"',
            "The two arms have one name in q17.toml, table [arms]. Found 'TABLET' for control and for "
            "experimental. Accepted: the two different values of the treatment column. Correct one of them.",
        ),
        (
            "columns",
            'time = "REGION"',
            "One column is given two parts in q17.toml, table [columns]. Found 'REGION' for time and strata. "
            "Accepted: a different column for each part. Correct one of them.",
        ),
        (
            "enrolment",
            "planned_subjects = 400",
            "Fewer subjects than events are planned in q17.toml, table [enrolment], key planned_subjects. "
            "Found 400 subjects for 533 planned events. Accepted: a whole number of at least planned_events. "
            "Correct planned_subjects or planned_events.",
        ),
        (
            "analysis",
            'subgroups = ["SEX"]',
            "Subgroups are not computed by this version in q17.toml, table [analysis], key subgroups. Found "
            "['SEX']. Accepted: the table without this key. Change the plan, or use a version that does so.",
        ),
        (
            "columns",
            'site = "SITEID"',
            "A site column is not read by this version in q17.toml, table [columns], key site. Found "
            "'SITEID'. Accepted: the table without this key. Change the plan, or use a version that does so.",
        ),
    ],
)
def test_one_wrong_key_gives_one_sentence(table, line, sentence):
    assert problems(with_line(table, line)) == [sentence]


@pytest.mark.parametrize(
    ("table", "line"),
    [
        ("trial", 'name = ""'),
        ("trial", 'name = " Q17"'),
        ("trial", 'title = "two\\nlines"'),
        ("trial", "start_date = 2024-03-01T00:00:00"),
        ("arms", "allocation = [1]"),
        ("arms", "allocation = [0, 1]"),
        ("arms", "allocation = [1.5, 1]"),
        ("arms", 'masked = "yes"'),
        ("endpoint", 'event_is = "worse"'),
        ("columns", 'strata = ["REGION", "REGION"]'),
        ("columns", 'strata = "REGION"'),
        ("design", "alpha = 0"),
        ("design", "alpha = 0.5"),
        ("design", "alpha = nan"),
        ("design", "alpha = true"),
        ("design", "sides = 3"),
        ("design", "sides = 1.0"),
        ("design", "power = 1"),
        ("design", "hazard_ratio = 1.0"),
        ("design", "hazard_ratio = inf"),
        ("design", "planned_events = 0"),
        ("design", "planned_events = 533.0"),
        ("design", "looks = []"),
        ("design", "looks = [0.5]"),
        ("design", "looks = [0.0, 1.0]"),
        ("design", "looks = [0.5, 1.0, 1.5]"),
        ("design", 'information = "deaths"'),
        ("efficacy", 'spending = "O\'Brien Fleming"'),
        ("analysis", "confidence = 95"),
    ],
)
def test_a_value_outside_its_domain_is_refused_with_the_domain(table, line):
    key = line.split(" = ")[0]
    (sentence,) = problems(with_line(table, line))
    assert f"table [{table}], key {key}. Found " in sentence
    assert TABLES[table].keys[key].accepted[1:].rstrip(".") in sentence


@pytest.mark.parametrize(
    ("table", "key"),
    [(name, key) for name, table in TABLES.items() if table.required for key in table.required_keys],
)
def test_a_missing_key_is_named_with_what_it_holds(table, key):
    text = re.sub(rf"(?m)(\[{table}\]\n(?:.+ = .+\n)*?){key} = .*\n", r"\1", SOUND)
    (sentence,) = problems(text)
    assert sentence.startswith(f"Key {key} missing in q17.toml, table [{table}]. Accepted: ")


def test_everything_wrong_is_told_in_one_go():
    text = (
        SOUND.replace("power = 0.9", "powr = 0.9")
        .replace('"TABLET"', '"PLACEBO"')
        .replace("= 1\n[tr", "= 2\n[tr")
    )
    with pytest.raises(PlanRefused) as refusal:
        read(text)
    starts = [problem.what for problem in refusal.value.problems]
    assert starts == [
        "Plan format not known",
        "Unknown key 'powr'",
        "Key power missing",
        "The two arms have one name",
    ]
    assert str(refusal.value).count("\n") == 3
    assert isinstance(refusal.value, DesignInvalid)
    assert refusal.value.what == "Plan format not known"


def test_an_empty_file_is_told_all_that_it_lacks():
    assert [sentence.split(" in q17")[0] for sentence in problems("")] == [
        "Plan format not known",
        *(f"Table [{table}] missing" for table in ("trial", "arms", "endpoint", "design", "efficacy")),
    ]


@pytest.mark.parametrize(
    ("content", "sentence"),
    [
        (
            SOUND.replace("alpha = 0.025", "alpha = ").encode(),
            "The plan file is not TOML in q17.toml. Found at line 18: invalid value. Accepted: TOML 1.0. "
            "Correct the file.",
        ),
        (
            SOUND.replace("tablet against", "tablet gegen\xfcber").encode("latin-1"),
            "The plan file is not UTF-8 in q17.toml. Found byte 0xfc on line 4. Accepted: TOML in UTF-8. "
            "Correct the file.",
        ),
        (
            b"a = " + b"[" * 100_000,
            "The plan file is not TOML in q17.toml. Found lists or tables nested too deeply. Accepted: "
            "TOML 1.0. Correct the file.",
        ),
        (
            b"#" * 300_000,
            "The plan file is too large in q17.toml. Found 300000 bytes. Accepted: at most 262144 bytes. "
            "Correct the file.",
        ),
    ],
)
def test_a_file_that_is_no_toml_is_told_with_its_place(content, sentence):
    with pytest.raises(PlanRefused) as refusal:
        read_plan(content, name="q17.toml", limits=Limits())
    assert str(refusal.value) == sentence


def test_a_number_of_ten_thousand_digits_is_refused_and_not_a_crash():
    assert "The plan file is not TOML" in problems("a = " + "9" * 10_000)[0]


def test_a_value_where_a_table_belongs_is_told():
    assert "arms is not written as [arms] in q17.toml, key arms. Found 3." in "\n".join(
        problems("format = 1\narms = 3\n")
    ).replace("Arms is", "arms is")


SEQUENTIAL_TABLES = """
[futility]
spending = "Hwang-Shih-DeCani"
parameter = -3
[harm]
spending = "Pocock-type"
alpha = 0.025
[[held]]
number = 1
events = 150
z = 1.1
efficacy_z = 3.6
alpha_spent = 0.00016
source = "Charter table 2"
"""

OPTIONAL_TABLES = """
[futility]
spending = "Hwang-Shih-DeCani"
parameter = -3
[harm]
spending = "Pocock-type"
alpha = 0.025
parameter = "DEATH"
[[hypothesis]]
name = "Death"
parameter = "DEATH"
label = "Death from any cause"
event_is = "bad"
after = "primary"
alpha = 0.025
planned_events = 300
efficacy = {spending = "O'Brien-Fleming-type"}
[[held]]
number = 1
events = 150
source = "Charter table 2"
"""


def test_harm_on_another_endpoint_and_further_hypotheses_are_read():
    plan = read(SOUND + OPTIONAL_TABLES)
    assert plan.harm.endpoint_parameter == "DEATH"
    (death,) = plan.hypotheses
    assert (death.name, death.after, death.alpha, death.planned_events) == ("Death", "primary", 0.025, 300)
    assert death.efficacy.spending == "O'Brien-Fleming-type"


def test_futility_harm_and_held_looks_are_read():
    plan = read(SOUND + SEQUENTIAL_TABLES)
    assert (plan.futility.spending, plan.futility.parameter) == ("Hwang-Shih-DeCani", -3.0)
    assert (plan.harm.spending, plan.harm.alpha) == ("Pocock-type", 0.025)
    assert [(held.events, held.efficacy_z) for held in plan.held] == [(150, 3.6)]


@pytest.mark.parametrize(
    ("lines", "start"),
    [
        ('rule = "hazard ratio"\nlimit = 1.0\nbinding = true', "A futility rule is not binding"),
        (
            'spending = "table"\npoints = [[0.5, 0.01], [1, 0.2]]',
            "The futility table does not end at the type II error",
        ),
    ],
)
def test_a_futility_that_cannot_be_is_refused_in_a_sentence(lines, start):
    (told,) = problems(f"{SOUND}\n[futility]\n{lines}\n")
    assert told.startswith(start)


def test_a_futility_table_that_ends_at_one_minus_the_power_passes():
    read(f'{SOUND}\n[futility]\nspending = "table"\npoints = [[0.5, 0.01], [1, 0.1]]\n')


def test_futility_that_leaves_efficacy_no_room_is_refused_in_a_sentence():
    text = with_line("design", "looks = [0.5, 0.97, 1.0]")
    lines = '\n[futility]\nspending = "Hwang-Shih-DeCani"\nparameter = 60\nbinding = true\n'
    (told,) = problems(text + lines)
    assert told.startswith("The futility boundary leaves efficacy too little room for the power")


def test_the_calendar_needs_its_two_ends_and_a_planned_end_the_calendar():
    assert problems(with_line("design", 'spending_clock = "calendar"'))[0].startswith(
        "Key planned_end_date missing"
    )
    assert problems(with_line("trial", "planned_end_date = 2027-03-01"))[0].startswith(
        "Key planned_end_date has no meaning here"
    )


def test_held_looks_whose_events_do_not_grow_are_refused_in_a_sentence():
    held = '\n[[held]]\nnumber = {}\nsource = "Charter"\nevents = 150\nefficacy_z = {}\n'
    (told,) = problems(SOUND + held.format(1, 3.6) + held.format(2, 2.5))
    assert told.startswith("Events do not grow from one held look with a bound to the next")


def test_a_held_look_without_events_has_no_bound():
    held = '\n[[held]]\nnumber = 1\nsource = "Charter"\nevents = 0\n'
    assert read(SOUND + held).held[0].efficacy_z is None
    (told,) = problems(f"{SOUND}{held}efficacy_z = 3.6\n")
    assert told.startswith("A held look without events has a bound")


@pytest.mark.parametrize(
    "written",
    [
        "z = 1e308",
        "z = -1e308",
        "efficacy_z = 1e308",
        "efficacy_z = -40.0",
        "efficacy_z = 0.0",
        "alpha_spent = 0.5",
    ],
)
def test_what_no_held_look_can_have_had_is_outside_its_domain(written):
    """Such a bound or z left no later bound to be found, or nothing to be drawn to scale."""
    (told,) = problems(f'{SOUND}\n[[held]]\nnumber = 1\nsource = "C"\nevents = 150\n{written}\n')
    assert told.startswith(f"{written.split()[0].capitalize()} outside its domain")


@pytest.mark.parametrize(
    "written",
    [
        "[analysis]\nconfidence = 0.9999999999999999",
        "[analysis]\nprior_hazard_ratio = 1e-300\nprior_std_error = 0.2",
        "[analysis]\nprior_hazard_ratio = 0.8\nprior_std_error = 1e-300",
        '[[hypothesis]]\nname = "D"\nparameter = "D"\nlabel = "D"\nevent_is = "bad"\nalpha = 0.01\n'
        'planned_events = 9\nefficacy = {spending = "Wang-Tsiatis", shape = 1e308}',
    ],
)
def test_a_number_that_no_double_can_be_computed_with_is_outside_its_domain(written):
    """Read, it would lock a plan under which no look can ever be opened."""
    told, *_ = problems(SOUND.replace("[analysis]\nconfidence = 0.9\n", f"{written}\n"))
    assert "outside its domain" in told


def test_held_looks_have_no_score_variance():
    text = with_line("design", 'information = "score variance"\nplanned_score_variance = 130.0')
    (told,) = problems(f'{text}\n[[held]]\nnumber = 1\nsource = "Charter"\nevents = 150\n')
    assert told.startswith("Held looks carry no score variance")


ALLOWED_BY = {
    "planned_per_month": "40",
    "dropout_per_year": "0.02",
    "ties": '"exact"',
    "curve_interval": '"plain"',
    "restricted_mean_at": "1095",
    "landmarks_at": "[365, 730]",
    "weights": "[[0, 0], [0, 1]]",
    "subgroups": '["SEX"]',
}


@pytest.mark.parametrize("part", [part for part in NOT_COMPUTED if part.key], ids=lambda part: part.key)
def test_each_key_of_later_work_is_accepted_as_written_and_then_refused_by_name(part):
    written = ALLOWED_BY.get(part.key, '"OTHER"')
    line = f"{part.key} = {written}"
    harm = f'\n[harm]\nspending = "Pocock-type"\nalpha = 0.025\n{line}\n'
    found = problems(SOUND + harm if part.table == "harm" else with_line(part.table, line))
    assert all(" by this version in " in sentence for sentence in found)
    assert any(f"table [{part.table}], key {part.key}." in sentence for sentence in found)


def test_futility_and_harm_go_with_one_side_only():
    text = with_line("design", "sides = 2") + OPTIONAL_TABLES
    whats = [sentence.split(" in q17")[0] for sentence in problems(text)]
    assert whats[:2] == [
        "Futility goes with a one-sided plan only",
        "Harm goes with a one-sided plan only",
    ]


@pytest.mark.parametrize(
    ("lines", "start"),
    [
        ("", "Futility needs one way to be decided"),
        ('spending = "power"', "Key exponent missing"),
        ('spending = "Pocock-type"\nparameter = 1', "Key parameter has no meaning here"),
        ('rule = "conditional power"', "Key limit missing"),
        ('rule = "conditional power"\nlimit = 1.5', "A conditional power is below 1"),
        ('spending = "Pocock-type"\nlimit = 0.2', "Key limit has no meaning here"),
    ],
)
def test_the_keys_of_futility_fit_each_other(lines, start):
    assert problems(f"{SOUND}[futility]\n{lines}\n")[0].startswith(start)


@pytest.mark.parametrize(("family", "needed"), [(family, key) for family, key in FAMILIES.items() if key])
def test_each_family_asks_for_its_own_key(family, needed):
    found = problems(with_line("efficacy", f'spending = "{family}"'))
    assert found[0] == (
        f"Key {needed} missing in q17.toml, table [efficacy]. Found spending {family!r} without it. Add a "
        f"line for {needed}."
    )


def test_a_spending_table_ends_at_the_level_of_one_side():
    points = "points = [[0.5, 0.003], [1, 0.05]]"
    found = problems(with_line("efficacy", f'spending = "table"\n{points}'))
    assert found[0] == (
        "The spending table does not end at alpha in q17.toml, table [efficacy], key points. Found 0.05 at "
        "1. Accepted: 0.025, the level of one side, at information fraction 1. Correct the last point."
    )


@pytest.mark.parametrize(
    ("old", "new", "start"),
    [
        ('after = "primary"', 'after = "Stroke"', "A hypothesis waits for one that does not exist"),
        ('name = "Death"', 'name = "primary"', "Two hypotheses have one name"),
        ("number = 1", "number = 2", "Held looks are not numbered in order"),
        ("efficacy = {", "efficacy = {exponent = 1, ", "Key exponent has no meaning here"),
        ("efficacy = {spending", "efficacy = {spendin", "Unknown key 'spendin'"),
    ],
)
def test_the_keys_of_hypotheses_and_held_looks_fit_each_other(old, new, start):
    assert any(sentence.startswith(start) for sentence in problems(SOUND + OPTIONAL_TABLES.replace(old, new)))


def test_a_good_event_asks_for_a_ratio_above_1():
    good = SOUND.replace('event_is = "bad"', 'event_is = "good"')
    assert problems(good)[0].startswith("The planned hazard ratio favours control")
    assert read(good.replace("hazard_ratio = 0.75", "hazard_ratio = 1.33")).endpoint.direction == -1


def test_the_calendar_clock_keeps_its_dates_in_order():
    text = with_line("trial", "planned_end_date = 2024-02-01")
    assert problems(text)[0].startswith("Planned end not after the start")


@given(st.binary(max_size=60))
def test_no_bytes_bring_the_reader_down(content):
    with pytest.raises(PlanRefused):
        read_plan(content, name="q17.toml", limits=Limits())


VALUES = st.recursive(
    st.one_of(
        st.booleans(),
        st.integers(-(10**400), 10**400),
        st.floats(),
        st.text(max_size=5),
        st.dates(),
        st.datetimes(),
    ),
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.text(max_size=4), inner, max_size=2),
    max_leaves=6,
)


@given(st.data())
def test_no_value_of_any_key_brings_the_checks_down(data):
    document = {
        table: {key: data.draw(VALUES) for key in data.draw(st.sets(st.sampled_from(spec.known), max_size=4))}
        for table, spec in TABLES.items()
    }
    with mock.patch("app.intake.plan.tomllib.loads", return_value=document), pytest.raises(PlanRefused):
        read("")
