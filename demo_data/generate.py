"""Make the four extracts of an invented trial: `python3 demo_data/generate.py` writes them beside this file.

900 patients are randomised over two years, 1:1 in blocks of four within six strata, to tablet or placebo; the
true hazard ratio is 0.75. The seed was chosen so that the third look does not cross its boundary and the
fourth does. Nothing else is arranged but one withdrawal and the rows listed in BY_HAND, which show what
adjudication and slips of the pen do to an extract. Only uniform numbers are drawn, so that any numpy will do.
"""

from __future__ import annotations

import csv
import io
import tomllib
from collections.abc import Iterator
from dataclasses import dataclass
from datetime import date, timedelta
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

FOLDER = Path(__file__).resolve().parent

SEED = 226
N_PATIENTS = 900
START = date(2023, 3, 3)
DAYS_OF_ENROLMENT = 731
HAZARD_RATIO = 0.75
ADMISSIONS_A_YEAR = 0.26  # of a patient on placebo, in the region North, without earlier heart failure
DEATHS_A_YEAR = 0.11
DROP_OUTS_A_YEAR = 0.035
REGIONS = {"North": 1.0, "South": 1.2, "East": 0.9}  # hazards relative to North
PRIOR_FAILURE = {"No": 1.0, "Yes": 1.6}
MEAN_DAYS_TO_REPORT = 12.0
NEVER = 10**6
WITHDREW_AT_ONCE = 639  # the patient with this number, on the day of randomisation

COLUMNS = (
    *("STUDYID", "USUBJID", "TRTP", "PARAMCD", "PARAM", "AVAL", "CNSR", "EVNTDESC", "STARTDT", "ADT"),
    *("REGION", "PRIORHF", "SEX", "AGEGR1"),
)
PARAMETERS = {
    "DEATHHF": "Time to death or heart-failure admission (days)",
    "DEATH": "Time to death from any cause (days)",
}

Days = NDArray[np.int64]
Row = dict[str, str | int]


@dataclass(frozen=True)
class Patients:
    """The truth: a row per patient in the order of randomisation. Days count from each one's own start."""

    start: list[date]
    region: list[str]
    prior: list[str]
    tablet: NDArray[np.bool_]
    sex: list[str]
    age: list[str]
    admission: Days
    death: Days
    drop_out: Days
    withdrew: NDArray[np.bool_]
    days_to_report: Days


@dataclass(frozen=True)
class Cut:
    """Up to when the data go, and when they were taken out of the database: reports come in between."""

    cutoff: date
    extracted: date


def waiting_days(rng: np.random.Generator, a_year: NDArray[np.float64]) -> Days:
    """Exponential waiting times in whole days, the day of randomisation being day 1."""
    days = -np.log1p(-rng.random(a_year.size)) / (a_year / 365.25)
    return np.minimum(np.ceil(days), NEVER).astype(np.int64)


def pick(rng: np.random.Generator, levels: list[str], shares: list[float]) -> list[str]:
    index = np.searchsorted(np.cumsum(shares), rng.random(N_PATIENTS), side="right")
    return [levels[at] for at in np.minimum(index, len(levels) - 1)]


def randomise(rng: np.random.Generator, strata: list[tuple[str, str]]) -> NDArray[np.bool_]:
    """Blocks of four, two of each arm, within each stratum in the order of entry."""
    waiting: dict[tuple[str, str], list[bool]] = {}
    tablet = []
    for stratum in strata:
        if not waiting.get(stratum):
            order = np.argsort(rng.random(4))
            waiting[stratum] = [bool(at < 2) for at in order]
        tablet.append(waiting[stratum].pop())
    return np.array(tablet)


def make_patients(seed: int) -> Patients:
    rng = np.random.default_rng(seed)
    entry = np.sort(np.floor(DAYS_OF_ENROLMENT * rng.random(N_PATIENTS) ** 0.8).astype(np.int64))
    region = pick(rng, list(REGIONS), [0.45, 0.33, 0.22])
    prior = pick(rng, list(PRIOR_FAILURE), [0.6, 0.4])
    tablet = randomise(rng, list(zip(region, prior, strict=True)))
    relative = np.array(
        [REGIONS[where] * PRIOR_FAILURE[had] for where, had in zip(region, prior, strict=True)]
    )
    hazard = relative * np.where(tablet, HAZARD_RATIO, 1.0)
    patients = Patients(
        start=[START + timedelta(days=int(day)) for day in entry],
        region=region,
        prior=prior,
        tablet=tablet,
        sex=pick(rng, ["F", "M"], [0.44, 0.56]),
        age=pick(rng, ["<65", "65-74", ">=75"], [0.37, 0.38, 0.25]),
        admission=waiting_days(rng, ADMISSIONS_A_YEAR * hazard),
        death=waiting_days(rng, DEATHS_A_YEAR * hazard),
        drop_out=waiting_days(rng, np.full(N_PATIENTS, DROP_OUTS_A_YEAR)),
        withdrew=rng.random(N_PATIENTS) < 0.6,
        days_to_report=waiting_days(rng, np.full(N_PATIENTS, 365.25 / MEAN_DAYS_TO_REPORT)),
    )
    patients.drop_out[WITHDREW_AT_ONCE - 1] = 1
    patients.withdrew[WITHDREW_AT_ONCE - 1] = True
    return patients


@dataclass(frozen=True)
class ByHand:
    """What adjudication, a late correction or a slip of the pen makes of a row in the extracts named."""

    extracts: tuple[int, ...]
    patient: int
    values: dict[str, str | int]
    parameters: tuple[str, ...] = ("DEATHHF",)


ADMITTED = "Heart-failure admission"
BY_HAND = (
    # reported as events, then found by the adjudicators to be no heart failure
    ByHand((2,), 144, {"CNSR": 0, "EVNTDESC": ADMITTED, "ADT": "2025-01-20"}),
    ByHand((3,), 441, {"CNSR": 0, "EVNTDESC": ADMITTED, "ADT": "2025-08-07"}),
    # admissions dated by the day of the report at first
    ByHand((2,), 470, {"ADT": "2025-02-11"}),
    ByHand((3,), 176, {"ADT": "2025-07-31"}),
    # digits exchanged: 414, 856 and Q17
    ByHand((2,), 339, {"AVAL": 441}),
    ByHand((4,), 503, {"AVAL": 865}),
    ByHand((3, 4), 842, {"STUDYID": "Q71"}, ("DEATHHF", "DEATH")),
    # derived anew, as no day in the trial
    ByHand((4,), WITHDREW_AT_ONCE, {"AVAL": 0}, ("DEATHHF", "DEATH")),
)


def follow_up(patients: Patients, at: int, parameter: str, cut: Cut) -> tuple[int, int, str]:
    """Days, CNSR and description of one patient as the database knew them at `cut`."""
    event, text = int(patients.death[at]), "Death"
    if parameter == "DEATHHF" and patients.admission[at] < event:
        event, text = int(patients.admission[at]), ADMITTED
    start, left = patients.start[at], int(patients.drop_out[at])
    in_trial = min(left, (cut.cutoff - start).days + 1)
    known_by = event - 1 + int(patients.days_to_report[at])
    if event <= in_trial and known_by <= (cut.extracted - start).days:
        return event, 0, text
    if left > in_trial:
        return in_trial, 1, f"{'Alive' if parameter == 'DEATH' else 'Event-free'} at data cutoff"
    return in_trial, *((2, "Withdrew consent") if patients.withdrew[at] else (3, "Lost to follow-up"))


def row_of(patients: Patients, at: int, parameter: str, cut: Cut) -> Row:
    days, censor, text = follow_up(patients, at, parameter, cut)
    values = (
        "Q17",
        f"Q17-{at + 1:04d}",
        "TABLET" if patients.tablet[at] else "PLACEBO",
        parameter,
        PARAMETERS[parameter],
        days,
        censor,
        text,
        patients.start[at].isoformat(),
        (patients.start[at] + timedelta(days=days - 1)).isoformat(),
        patients.region[at],
        patients.prior[at],
        patients.sex[at],
        patients.age[at],
    )
    return dict(zip(COLUMNS, values, strict=True))


def change_by_hand(row: Row, at: int, number: int) -> Row:
    """The row with what BY_HAND says of it; a new date carries its time along."""
    for change in BY_HAND:
        if number in change.extracts and at + 1 == change.patient and row["PARAMCD"] in change.parameters:
            row = {**row, **change.values}
            if "ADT" in change.values:
                last, first = (date.fromisoformat(str(row[name])) for name in ("ADT", "STARTDT"))
                row["AVAL"] = (last - first).days + 1
    return row


def rows_of(patients: Patients, number: int, cut: Cut) -> Iterator[Row]:
    for at in range(N_PATIENTS):
        if patients.start[at] <= cut.cutoff:
            for parameter in PARAMETERS:
                yield change_by_hand(row_of(patients, at, parameter, cut), at, number)


def extract_csv(patients: Patients, number: int, cut: Cut) -> bytes:
    text = io.StringIO(newline="")
    writer = csv.DictWriter(text, COLUMNS, lineterminator="\n")
    writer.writeheader()
    writer.writerows(rows_of(patients, number, cut))
    return text.getvalue().encode("utf-8")


def extracts() -> dict[str, bytes]:
    """Every extract by its file name, cut as extracts.toml says."""
    listed = tomllib.loads((FOLDER / "extracts.toml").read_text(encoding="utf-8"))["extract"]
    patients = make_patients(SEED)
    return {
        each["file"]: extract_csv(patients, number, Cut(each["cutoff"], each["extracted"]))
        for number, each in enumerate(listed, 1)
    }


if __name__ == "__main__":
    for name, content in extracts().items():
        (FOLDER / name).write_bytes(content)
