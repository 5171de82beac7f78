"""Columns of names, birth dates, addresses or contact details are known by the words of their names."""

from __future__ import annotations

import pytest

from app.intake.privacy import is_identifying
from tests.unit.intake.trial import file_of, ids, read, rows


@pytest.mark.parametrize(
    "name",
    [
        *("NAME", "PatientName", "PATIENT_NAME", "Patient name", "SUBJECTNAME", "FIRSTNAME", "Last Name"),
        *(
            "INITIALS",
            "Subject initials",
            "SURNAME",
            "BRTHDTC",
            "BRTHDT",
            "DOB",
            "Date of Birth",
            "birthDate",
        ),
        *("ADDRESS", "Home address", "POSTCODE", "zip_code", "Street", "PHONE", "Telephone number", "Email"),
        *("E-mail", "FAX", "Mobile", "SSN", "MRN", "contact_name", "Investigator Name"),
    ],
)
def test_a_column_that_identifies_is_known(name):
    assert is_identifying(name)


@pytest.mark.parametrize(
    "name",
    [
        *(
            "USUBJID",
            "SUBJID",
            "SITEID",
            "SITENAME",
            "Study name",
            "ARM_NAME",
            "AGE",
            "AGEGR1",
            "SEX",
            "REGION",
        ),
        *("ADT", "STARTDT", "Unique Subject Identifier", "LAST_CONTACT", "LSTALVDT", "PARAM", "EVNTDESC"),
        *("BIRTH_YEAR", "MAILINGS_SENT", "RENAMED", "COUNTRY", "WEIGHT", "FAXITRON"),
    ],
)
def test_a_column_of_trial_data_is_not(name):
    assert not is_identifying(name)


def test_a_file_that_is_only_kept_is_looked_at_as_well():
    other = [{"USUBJID": "T1-001", "DOB": "1950-01-01"}]
    extract = read(file_of(rows()), file_of(other, "adsl.csv"))
    assert ids(extract) == ["identifying-column"]
    assert extract.findings[0].where == "adsl.csv, header"


@pytest.mark.parametrize("text", ["Called +44 20 7946 0000", "tel. 5550100", "write to someone@example.org"])
def test_contact_details_in_a_description_block_and_are_not_repeated(text):
    listed = rows()
    listed[3]["EVNTDESC"] = text
    (finding,) = read(file_of(listed)).blocking
    assert (finding.id, finding.rows) == ("identifying-value", (4,))
    assert text not in str(finding)


def test_identifiers_with_many_digits_are_not_taken_for_telephone_numbers():
    listed = rows()
    for at, row in enumerate(listed):
        row["USUBJID"] = f"001-701-{at:09d}"
    assert ids(read(file_of(listed))) == []
