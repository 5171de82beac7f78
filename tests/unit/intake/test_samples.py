"""The pooled sample knows no arm, and two snapshots are compared subject by subject."""

from __future__ import annotations

import random

import numpy as np
import pytest

from app.errors import ValueRejected
from app.intake import csv_table, samples
from app.intake.samples import changes, read_pooled
from app.model.extract import PooledSample
from app.settings import Limits
from tests.unit.intake.trial import Row, file_of, plan, read, rows, without


def pooled(listed: list[Row]) -> PooledSample:
    return read_pooled([file_of(listed)], plan(), limits=Limits())


def same(one: PooledSample, other: PooledSample) -> bool:
    arrays = ("time", "event", "stratum", "start_day", "end_day")
    return one.stratum_labels == other.stratum_labels and all(
        np.array_equal(getattr(one, name), getattr(other, name)) for name in arrays
    )


def test_the_pooled_sample_holds_what_the_sample_holds_but_for_arms_and_identifiers():
    sample, open_side = read(file_of(rows())).sample, pooled(rows())
    assert sorted(open_side.time) == sorted(sample.time)
    assert open_side.event.sum() == sample.event.sum()
    assert open_side.time_unit == "days"
    assert not hasattr(open_side, "experimental")
    assert not hasattr(open_side, "subject")


def test_the_pooled_sample_is_the_same_whoever_got_which_arm():
    turned = [{**row, "TRTP": "TABLET"} for row in rows()]
    assert same(pooled(rows()), pooled(turned))


def test_the_pooled_sample_keeps_nothing_of_the_order_received():
    by_arm = sorted(rows(), key=lambda row: row["TRTP"])
    shuffled = random.Random(1).sample(rows(), 12)
    assert same(pooled(by_arm), pooled(rows()))
    assert same(pooled(shuffled), pooled(rows()))


def test_the_arm_column_is_never_taken_from_the_file(monkeypatch):
    taken: list[frozenset[str]] = []

    def watch(file, wanted, limits):
        taken.append(frozenset(wanted))
        return csv_table.read_table(file, wanted, limits)

    monkeypatch.setattr("app.intake.rows.read_table", watch)
    pooled(rows())
    assert taken == [frozenset({"PARAMCD", "AVAL", "CNSR", "STARTDT", "ADT", "REGION"})]


def test_the_pooled_sample_is_read_without_an_arm_column_at_all():
    assert same(pooled(without("TRTP USUBJID EVNTDESC", rows())), pooled(rows()))


def test_rows_that_cannot_be_read_are_refused():
    listed = rows()
    listed[3]["AVAL"] = ""
    with pytest.raises(ValueRejected, match=r"Found 1 of 12 rows"):
        pooled(listed)
    with pytest.raises(ValueRejected, match="No time-to-event file in the snapshot"):
        pooled(without("CNSR", rows()))


def test_two_equal_snapshots_differ_in_nothing():
    sample = read(file_of(rows())).sample
    found = changes(sample, sample)
    assert found.n_common == 12
    assert {value for name, value in vars(found).items() if name != "n_common"} == {()}


def test_each_kind_of_change_is_told_by_subject():
    before, after = rows(), rows(14)
    after[1].update(CNSR="0", EVNTDESC="Death")  # 002: event
    after[2].update(CNSR="1", EVNTDESC="Alive")  # 003: reversed
    after[4].update(ADT="2024-05-10", AVAL="102")  # 005: moved
    after[7]["TRTP"] = {"TABLET": "PLACEBO", "PLACEBO": "TABLET"}[after[7]["TRTP"]]  # 008
    after[8]["REGION"] = "South"  # 009
    del after[6]  # 007: vanished, had an event
    found = changes(read(file_of(before)).sample, read(file_of(after)).sample)
    assert found == samples.Changes(
        n_common=11,
        new_subjects=("T1-013", "T1-014"),
        vanished_subjects=("T1-007",),
        new_events=("T1-002",),
        reversed_events=("T1-003",),
        moved_events=("T1-005",),
        changed_arm=("T1-008",),
        changed_stratum=("T1-009",),
        new_subjects_with_event=("T1-013",),
        vanished_with_event=("T1-007",),
    )


def test_the_changes_account_for_the_events():
    before, after = rows(), rows(30)[3:]
    after[2].update(CNSR="1", EVNTDESC="Alive")
    one, two = read(file_of(before)).sample, read(file_of(after)).sample
    found = changes(one, two)
    gained = len(found.new_events) + len(found.new_subjects_with_event)
    lost = len(found.reversed_events) + len(found.vanished_with_event)
    assert two.event.sum() == one.event.sum() + gained - lost


def test_a_later_cutoff_moves_censoring_and_no_event():
    later = [
        {**row, "AVAL": str(int(row["AVAL"]) + 30), "ADT": "2025-07-30"} if row["CNSR"] == "1" else row
        for row in rows()
    ]
    found = changes(read(file_of(rows())).sample, read(file_of(later), cutoff=None).sample)
    assert found.moved_events == ()


def test_strata_are_compared_by_name_and_not_by_number():
    after = rows(13)
    after[12]["REGION"] = "East"  # sorts before the others and shifts their numbers
    found = changes(read(file_of(rows())).sample, read(file_of(after)).sample)
    assert found.changed_stratum == ()
