"""What must not be in an extract at all: names, birth dates, addresses and contact details."""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence

from app.intake.findings import finding
from app.intake.rows import Rows
from app.model.extract import Finding

# A column is refused when one of these is a word of its name, or when its words written together are.
_PERSON = ("surname", "forename", "firstname", "lastname", "fullname", "maidenname", "nickname", "initials")
_BIRTH = ("birth", "birthdate", "birthday", "birthdt", "brthdt", "brthdtc", "dob", "dateofbirth")
_PLACE = ("address", "addr", "street", "postcode", "postalcode", "zip", "zipcode")
_CONTACT = ("phone", "telephone", "mobile", "fax", "email", "mail")
_NUMBER = ("ssn", "nino", "passport", "mrn", "nhsno")
_WORDS = frozenset((*_PERSON, *_BIRTH, *_PLACE, *_CONTACT, *_NUMBER))
_KIN_AND_STAFF = ("mother", "father", "contact", "investigator", "physician")
_PART_OF_NAME = ("first", "last", "middle", "family", "given", "full", "maiden")
# whose name it is, for a site or a drug has a name too
_NAMED = frozenset(("patient", "subject", "participant", "person", *_KIN_AND_STAFF, *_PART_OF_NAME))
_EMAIL = re.compile(r"[^@\s,;]+@[^@\s,;]+\.[A-Za-z]{2,}")
_PHONE = re.compile(r"\+\d[\d ()./-]{7,}\d|\b(tel|phone)\b\D{0,5}\d", re.IGNORECASE)


def _words(name: str) -> list[str]:
    """`PatientName`, `PATIENT_NAME` and `Patient name` all give patient and name."""
    spaced = re.sub(r"(?<=[a-z0-9])(?=[A-Z])", " ", name)
    return [word for word in re.split(r"[^A-Za-z]+", spaced.lower()) if word]


def is_identifying(column: str) -> bool:
    """Whether a column's name, word by word, says that it holds what identifies a person."""
    words = _words(column)
    together = "".join(words)
    if together == "name" or ("name" in words and _NAMED & set(words)):
        return True
    if "birth" in words and "year" in words:
        return False
    runs_together = any(together == f"{owner}name" for owner in _NAMED)
    return runs_together or together in _WORDS or not _WORDS.isdisjoint(words)


def identifying_columns(header: Sequence[str], file: str) -> Iterator[Finding]:
    named = [name for name in header if is_identifying(name)]
    if named:
        yield finding(
            "identifying-column",
            "block",
            "columns that identify a person",
            f"{file}, header",
            ", ".join(map(repr, named[:5])) + (f" and {len(named) - 5} more" if len(named) > 5 else ""),
            "no names, birth dates, addresses or contact details",
            "have the data centre remove the columns, or rename those that hold nothing of the kind",
        )


def identifying_values(rows: Rows) -> Iterator[Finding]:
    """E-mail addresses and telephone numbers in the texts that are read; the values are not repeated."""
    texts = {part: rows.parts[part] for part in ("subject", "arm", "event_text") if part in rows.parts}
    columns = [(rows.choice.parts[part], column) for part, column in texts.items()]
    for name, column in [*columns, *zip(rows.choice.strata, rows.strata, strict=True)]:
        yield from rows.findings(
            column.where(_identifies),
            "identifying-value",
            "block",
            "a text that looks like an e-mail address or a telephone number",
            name,
            accepted="no contact details",
            remedy="have the data centre remove them",
        )


def _identifies(text: str) -> bool:
    """The plain looks come first: a column of subjects holds as many texts as rows."""
    if "@" in text and _EMAIL.search(text):
        return True
    lower = text.lower()
    return ("+" in text or "tel" in lower or "phone" in lower) and bool(_PHONE.search(text))
