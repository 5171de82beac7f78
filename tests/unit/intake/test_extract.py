"""Columns by part, several files, units and dates, and what is listed of an extract."""

from __future__ import annotations

from dataclasses import replace
from datetime import date

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.intake.extract import KEPT, TIME_TO_EVENT, received_file
from app.model.extract import Extract, with_severity
from tests.unit.intake.trial import CUTOFF, file_of, ids, plan, read, rows, text_of, without


def test_a_sound_extract_becomes_a_sample_in_the_order_received():
    listed = rows()[::-1]
    sample = read(file_of(listed)).sample
    assert sample.subject == tuple(row["USUBJID"] for row in listed)
    assert sample.time.tolist() == [float(row["AVAL"]) for row in listed]
    assert sample.event.tolist() == [row["CNSR"] == "0" for row in listed]
    assert sample.experimental.tolist() == [row["TRTP"] == "TABLET" for row in listed]
    assert [sample.stratum_labels[at] for at in sample.stratum] == [row["REGION"] for row in listed]
    assert sample.start_day[0] == (date.fromisoformat(listed[0]["STARTDT"]) - date(1970, 1, 1)).days
    assert sample.time_unit == "days"
    assert not sample.time.flags.writeable


def test_what_was_read_and_left_out_is_listed():
    listed = [{**row, "SEX": "F", "AGE": "70"} for row in rows()]
    (reading,) = read(file_of(listed)).files
    assert reading.n_rows == 12
    assert reading.columns_left_out == ("SEX", "AGE")
    assert reading.columns_read == tuple(rows()[0])
    assert reading.role == TIME_TO_EVENT


def test_every_endpoint_is_listed_with_rows_and_events_and_only_the_plans_is_checked():
    others = [{**row, "PARAMCD": "STROKE", "TRTP": "UNKNOWN", "AVAL": "-1"} for row in rows()[:3]]
    extract = read(file_of(rows() + others))
    assert extract.parameters == (("DEATH", 12, 6), ("STROKE", 3, 2))
    assert ids(extract) == []


def test_the_same_subject_may_stand_under_two_endpoints():
    others = [{**row, "PARAMCD": "STROKE"} for row in rows()]
    assert read(file_of(rows() + others)).sample is not None


def test_several_time_to_event_files_are_read_one_after_the_other():
    listed = rows()
    extract = read(file_of(listed[:7], "a.csv"), file_of(listed[7:], "b.csv"))
    assert [reading.n_rows for reading in extract.files] == [7, 5]
    assert np.array_equal(extract.sample.time, read(file_of(listed)).sample.time)


def test_a_finding_names_the_file_and_its_own_rows():
    listed = rows()
    listed[2]["AVAL"] = listed[9]["AVAL"] = "-1"
    extract = read(file_of(listed[:7], "a.csv"), file_of(listed[7:], "b.csv"))
    assert [(each.where, each.rows) for each in extract.findings] == [
        ("a.csv, column AVAL", (3,)),
        ("b.csv, column AVAL", (3,)),
    ]


def test_a_subject_in_two_files_is_found_in_both():
    listed = rows()
    extract = read(file_of(listed, "a.csv"), file_of(listed[:1], "b.csv"))
    assert [(each.id, each.where) for each in extract.findings] == [
        ("subject-repeated", "a.csv, column USUBJID"),
        ("subject-repeated", "b.csv, column USUBJID"),
    ]


def test_other_files_are_kept_and_not_read():
    other = received_file("adae.csv", b"USUBJID,AETERM\nT1-001,Headache\n")
    binary = received_file("adsl.xpt", b"HEADER RECORD\0\0")
    extract = read(file_of(rows()), other, binary)
    assert [reading.role for reading in extract.files] == [TIME_TO_EVENT, KEPT, KEPT]
    assert extract.files[1].columns_left_out == ("USUBJID", "AETERM")
    assert extract.files[1].columns_read == ()
    assert extract.sample is not None


def test_laboratory_values_with_a_parameter_and_a_value_are_no_time_to_event_file():
    other = received_file("adlb.csv", b"USUBJID,PARAMCD,AVAL\nT1-001,ALT,33\n")
    assert read(file_of(rows()), other).files[1].role == KEPT


def test_a_csv_file_that_cannot_be_read_blocks_also_beside_a_sound_one():
    assert ids(read(file_of(rows()), received_file("other.csv", b""))) == ["file-empty"]


def test_no_file_and_two_files_of_one_name_are_told():
    assert ids(read()) == ["no-file"]
    assert "file-repeated" in ids(read(file_of(rows()[:6]), file_of(rows()[6:])))


def test_the_file_that_comes_nearest_is_told_what_it_lacks():
    other = received_file("a.csv", b"X,Y\n1,2\n")
    extract = read(other, file_of(without("CNSR AVAL", rows()), "b.csv"))
    assert [(each.id, each.where, each.what) for each in extract.findings] == [
        ("column-missing", "b.csv", "column 'AVAL' missing"),
        ("column-missing", "b.csv", "column 'CNSR' missing"),
    ]


def test_the_nearest_name_is_shown_for_a_missing_column():
    listed = [
        {("TRT01P" if name == "TRTP" else name): value for name, value in row.items()} for row in rows()
    ]
    (finding,) = read(file_of(listed)).findings
    assert finding.found == "no such column, the nearest is 'TRT01P'"


def test_columns_may_have_other_names_than_adams():
    columns = (
        'subject = "ID"\narm = "TRT01P"\ntime = "TTE"\ncensor = "CENSORED"\nparameter = "ENDPOINT"\n'
        'start = "RANDDT"\nend = "LASTDT"\nstrata = ["REGION"]'
    )
    names = {
        "USUBJID": "ID",
        "TRTP": "TRT01P",
        "AVAL": "TTE",
        "CNSR": "CENSORED",
        "PARAMCD": "ENDPOINT",
        "STARTDT": "RANDDT",
        "ADT": "LASTDT",
    }
    listed = [{names.get(name, name): value for name, value in row.items()} for row in rows()]
    sample = read(file_of(listed), under=plan(columns)).sample
    assert sample.time_unit == "days"
    assert sample.end_day is not None


def test_only_what_is_needed_need_be_there():
    listed = without("STUDYID EVNTDESC STARTDT ADT REGION", rows())
    extract = read(file_of(listed), under=plan(""), cutoff=None)
    assert extract.findings == ()
    assert extract.sample.time_unit == "as given"
    assert extract.sample.stratum_labels == ("All subjects",)
    assert extract.sample.start_day is None


def test_a_cutoff_that_cannot_be_checked_is_a_note():
    listed = without("STARTDT ADT", rows())
    assert [(each.id, each.severity) for each in read(file_of(listed)).findings] == [
        ("cutoff-not-checked", "note")
    ]


@pytest.mark.parametrize(
    ("column", "text", "unit"),
    [
        ("AVALU", "WEEKS", "weeks"),
        ("AVALU", "Month", "months"),
        ("AVALU", "YR", "years"),
        ("AVALU", "D", "days"),
        ("AVALU", "fortnights", "as given"),
        ("PARAM", "Time to death (weeks)", "weeks"),
        ("PARAM", "Time to death in months", "months"),
        ("PARAM", "Time to death within a year", "as given"),
    ],
)
def test_the_unit_is_what_the_extract_says(column, text, unit):
    listed = [{**row, column: text} for row in without("STARTDT ADT", rows())]
    assert read(file_of(listed), cutoff=None).sample.time_unit == unit


def test_weeks_that_are_those_of_the_dates_are_no_doubt():
    listed = [{**row, "AVALU": "WEEKS", "AVAL": f"{int(row['AVAL']) / 7:.1f}"} for row in rows()]
    extract = read(file_of(listed))
    assert extract.findings == ()
    assert extract.sample.time_unit == "weeks"
    listed[3]["AVAL"] = "99"
    assert ids(read(file_of(listed))) == ["time-disagrees-with-dates"]


def test_times_of_no_known_unit_beside_dates_are_a_doubt():
    listed = [{**row, "AVAL": f"{int(row['AVAL']) / 7:.1f}"} for row in rows()]
    extract = read(file_of(listed))
    assert ids(extract) == ["time-unit-unknown"]
    assert extract.sample.time_unit == "as given"


def test_a_date_column_that_the_plan_names_blocks_where_adams_own_is_a_doubt():
    listed = rows()
    listed[5]["ADT"] = "30JUN2025"
    extract = read(file_of(listed))
    assert [(each.id, each.severity) for each in extract.findings] == [("date-unreadable", "doubt")]
    assert extract.sample.end_day is None
    assert extract.sample.start_day is not None
    named = read(file_of(listed), under=plan('end = "ADT"\nstrata = ["REGION"]'))
    assert [(each.id, each.severity) for each in named.findings] == [("date-unreadable", "block")]


def test_a_date_column_that_the_plan_names_must_be_there():
    named = plan('end = "LASTDT"\nstrata = ["REGION"]')
    assert [each.what for each in read(file_of(rows()), under=named).findings] == ["column 'LASTDT' missing"]


def test_dates_are_not_compared_with_a_cutoff_that_was_not_given():
    assert ids(read(file_of(rows()), cutoff=None)) == []


def test_a_cutoff_far_after_the_data_is_a_doubt():
    assert ids(read(file_of(rows()), cutoff=CUTOFF.replace(year=2026))) == ["cutoff-far-from-data"]


def test_a_stratum_of_one_arm_and_an_extract_without_events_are_notes():
    listed = rows()
    listed[0]["REGION"] = "East"
    assert ids(read(file_of(listed))) == ["stratum-one-arm"]
    quiet = [{**row, "CNSR": "1", "EVNTDESC": "Alive"} for row in rows()]
    assert ids(read(file_of(quiet))) == ["no-events"]


def test_strata_of_several_factors_are_joined_in_the_plans_order_and_sorted():
    listed = [{**row, "PRIOR": ("No", "Yes")[at % 2]} for at, row in enumerate(rows())]
    sample = read(file_of(listed), under=plan('strata = ["REGION", "PRIOR"]')).sample
    assert sample.stratum_labels == ("North / No", "North / Yes", "South / No", "South / Yes")
    assert [sample.stratum_labels[at] for at in sample.stratum] == [
        f"{row['REGION']} / {row['PRIOR']}" for row in listed
    ]


def test_findings_come_worst_first():
    listed = rows()
    listed[0]["REGION"] = "East"
    listed[1]["STUDYID"] = "T2"
    listed[2]["AVAL"] = ""
    extract = read(file_of(listed))
    assert ids(extract) == ["time-missing", "study-differs", "stratum-one-arm"]
    assert with_severity(extract.findings, "block") == extract.blocking
    assert extract.sample is None


def test_five_rows_are_shown_and_all_are_counted():
    listed = [{**row, "CNSR": "?"} for row in rows()]
    finding = next(each for each in read(file_of(listed)).findings if each.id == "censor-unreadable")
    assert finding.rows == (1, 2, 3, 4, 5)
    assert finding.count == 12
    assert finding.found.startswith("12 rows, the first 1 ('?'), 2 ('?')")


def test_a_long_value_is_cut_where_it_is_quoted():
    listed = rows()
    listed[0]["TRTP"] = "X" * 5000
    assert len(str(read(file_of(listed)).findings[0])) < 400


def test_a_hundred_thousand_rows_are_checked_like_twelve():
    one = rows()
    many = [{**row, "USUBJID": f"T1-{at}-{copy}"} for copy in range(500) for at, row in enumerate(one)]
    extract = read(file_of(many))
    assert extract.findings == ()
    assert extract.sample.event.sum() == 3000


def test_equal_bytes_have_equal_digests():
    file = file_of(rows())
    assert file.digest == received_file("other.csv", text_of(rows()).encode()).digest
    assert read(file).files[0].digest == file.digest
    assert read(replace(file, name="x.csv")).files[0].name == "x.csv"


SOUND = text_of(rows()).encode()
PLAN = plan()


@given(st.binary(max_size=80))
def test_no_bytes_bring_the_reader_down(content):
    assert read(received_file("adtte.csv", content), under=PLAN).sample is None


@given(
    st.integers(0, len(SOUND)),
    st.integers(0, 12),
    st.sampled_from([b"", b'"', b",", b"\n", b"\r", b"\0", b"\xff", b"-", b".", b"9"]),
)
def test_no_slip_in_a_sound_file_brings_the_reader_down(place, removed, put):
    content = SOUND[:place] + put + SOUND[place + removed :]
    extract = read(received_file("adtte.csv", content), under=PLAN)
    assert isinstance(extract, Extract)
    assert (extract.sample is None) == bool(extract.blocking)
