"""A CSV file as columns of text: read as it was written, or refused with one sentence.

The structure (quotes, rows, widths) is checked on the bytes first, so that no reader can shift, fill or
rename a column; only then are the wanted columns taken, as text.
"""

from __future__ import annotations

import csv
import io
from collections import Counter
from collections.abc import Callable, Collection, Mapping
from dataclasses import dataclass
from typing import Any, cast

import numpy as np
import pandas as pd
from numpy.typing import DTypeLike, NDArray

from app.errors import ValueRejected
from app.intake.findings import finding, quoted, row_list
from app.model.extract import Finding, ReceivedFile
from app.model.values import Bools, Ints
from app.settings import Limits

_QUOTE, _COMMA, _NEWLINE = b'",\n'
_BYTE_ORDER_MARK = b"\xef\xbb\xbf"
LONGEST_HEADER = 100_000
_UTF16_MARKS = (b"\xff\xfe", b"\xfe\xff")

Texts = NDArray[np.object_]


class TableRefused(ValueRejected):
    """A file that cannot be read as a table; `finding` says why."""

    def __init__(self, reason: Finding) -> None:
        super().__init__(
            reason.what,
            where=reason.where,
            found=reason.found,
            accepted=reason.accepted,
            remedy=reason.remedy,
        )
        self.finding = reason


@dataclass(frozen=True, eq=False)
class TextTable:
    """The wanted columns of one file, each an array of its texts in the order received."""

    columns: Mapping[str, Texts]
    n_rows: int


@dataclass(frozen=True, eq=False)
class TextColumn:
    """A column by its distinct texts: `texts[codes[i]]` stands in row i. What is read is read once a text."""

    codes: Ints
    texts: tuple[str, ...]

    @classmethod
    def of(cls, values: Texts) -> TextColumn:
        codes, texts = pd.factorize(values)
        return cls(codes.astype(np.int64), tuple(texts))

    def where(self, holds: Callable[[str], bool]) -> Bools:
        """True in the rows whose text `holds`."""
        return cast(Bools, self.decoded(holds, np.bool_))

    def decoded(self, read: Callable[[str], Any], dtype: DTypeLike) -> NDArray[Any]:
        """`read` of each text, as an array with an element a row."""
        return np.array([read(text) for text in self.texts], dtype=dtype)[self.codes]

    def kept(self, rows: Bools) -> TextColumn:
        """The column in these rows, with the texts that are left."""
        codes = self.codes[rows]
        used = np.bincount(codes, minlength=len(self.texts)) > 0
        texts = tuple(text for text, is_used in zip(self.texts, used.tolist(), strict=True) if is_used)
        return TextColumn((np.cumsum(used) - 1)[codes], texts)

    def at(self, row: int) -> str:
        return self.texts[int(self.codes[row])]

    def quoted_at(self, row: int) -> str:
        """The text in this row as a finding quotes it."""
        return quoted(self.at(row))


def read_header(file: ReceivedFile) -> tuple[str, ...]:
    """The names of the columns; TableRefused when the bytes are no CSV text or the names are no names."""
    return _header(_text_bytes(file), file.name)


def _header(content: bytes, file: str) -> tuple[str, ...]:
    header = content[: _first_line_end(content)]
    _outside_quotes(np.frombuffer(header + b"\n", dtype=np.uint8), file)
    if not header or len(header) > LONGEST_HEADER:
        raise _refused(
            "header-unreadable",
            "header that cannot be read",
            file,
            found=f"a first row of {len(header):,} bytes",
            accepted=f"a first row of column names divided by commas, of at most {LONGEST_HEADER:,} bytes",
            remedy="export the file again as CSV",
        )
    names = tuple(next(csv.reader([header.decode("utf-8")])))
    if len(names) == 1 and any(other in names[0] for other in ";\t|"):
        raise _refused(
            "delimiter-not-comma",
            "columns not divided by commas",
            file,
            found=f"a header without a comma, {names[0][:40]!r}...",
            accepted="CSV with commas",
            remedy="export the file again as CSV with commas",
        )
    _check_names(names, file)
    return names


def read_table(file: ReceivedFile, wanted: Collection[str], limits: Limits) -> TextTable:
    """The columns `wanted` of a file whose header is known to hold them."""
    content = _text_bytes(file)
    names = _header(content, file.name)
    body = content[_first_line_end(content) + 1 :]
    n_rows = _checked_rows(body, len(names), file.name, limits)
    positions = [at for at, name in enumerate(names) if name in wanted]
    frame = pd.read_csv(
        io.BytesIO(body),
        header=None,
        usecols=positions,
        dtype=str,
        keep_default_na=False,
        na_filter=False,
        index_col=False,
        skip_blank_lines=False,
        encoding="utf-8",
    )
    columns = {names[at]: frame[at].to_numpy(dtype=object) for at in positions}
    return TextTable(columns, n_rows)


def _text_bytes(file: ReceivedFile) -> bytes:
    """The content as UTF-8 with plain line ends and exactly one at the end, without byte order mark."""
    content = file.content
    if not content.strip():
        raise _refused(
            "file-empty",
            "file empty",
            file.name,
            found=f"{len(content)} bytes",
            accepted="CSV with a header and a row per subject and endpoint",
            remedy="send the file again",
        )
    if content.startswith(_UTF16_MARKS):
        raise _not_utf8(file.name, "UTF-16 text")
    try:
        content.decode("utf-8")
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
        raise _not_utf8(file.name, f"byte 0x{content[error.start]:02x} on line {line} of the file") from error
    if b"\0" in content:
        raise _refused(
            "file-holds-nul",
            "file not a text",
            file.name,
            found="a NUL byte",
            accepted="CSV in UTF-8",
            remedy="export the file as CSV",
        )
    plain = content.removeprefix(_BYTE_ORDER_MARK)
    if b"\r" in plain:
        plain = plain.replace(b"\r\n", b"\n").replace(b"\r", b"\n")
    return plain.rstrip(b"\n") + b"\n"


def _not_utf8(name: str, found: str) -> TableRefused:
    return _refused(
        "file-not-utf8",
        "text other than UTF-8",
        name,
        found=found,
        accepted="CSV in UTF-8, with or without byte order mark",
        remedy="export the file again with the encoding UTF-8",
    )


def _first_line_end(content: bytes) -> int:
    """The place of the newline that ends the header, which may hold quoted newlines; the last one at most."""
    end = content.index(b"\n")
    inside_quotes = content.count(b'"', 0, end) % 2
    while inside_quotes and end + 1 < len(content):
        start, end = end + 1, content.index(b"\n", end + 1)
        inside_quotes ^= content.count(b'"', start, end) % 2
    return end


def _check_names(names: tuple[str, ...], file: str) -> None:
    repeated = [name for name, count in Counter(names).items() if count > 1 and name.strip()]
    if repeated:
        raise _refused(
            "column-repeated",
            "column named twice",
            f"{file}, header",
            found=", ".join(map(repr, repeated)),
            accepted="each column once",
            remedy="rename or remove one of them",
        )
    blank = [str(at) for at, name in enumerate(names, 1) if not name.strip()]
    if blank:
        raise _refused(
            "column-unnamed",
            "column without a name",
            f"{file}, header",
            found=f"none for column {', '.join(blank[:5])} of {len(names)}",
            accepted="a name for each column",
            remedy="name or remove the column",
        )


def _checked_rows(body: bytes, n_columns: int, file: str, limits: Limits) -> int:
    """How many rows `body` holds, each of `n_columns` fields; TableRefused where one is not."""
    if not body:
        raise _refused(
            "file-without-rows",
            "no data rows",
            file,
            found="a header only",
            accepted="a row per subject and endpoint",
            remedy="send the file again",
        )
    widths = _widths(np.frombuffer(body, dtype=np.uint8), file)
    if widths.size > limits.rows:
        raise _refused(
            "file-too-long",
            "too many rows",
            file,
            found=f"{widths.size:,}",
            accepted=f"at most {limits.rows:,}",
            remedy="leave out the endpoints and columns that are not needed",
        )
    ragged = np.flatnonzero(widths != n_columns)
    if ragged.size:
        raise _refused(
            "rows-ragged",
            "rows of another width than the header",
            file,
            found=row_list(ragged + 1, [f"{widths[at]} fields" for at in ragged[: limits.findings_shown]]),
            accepted=f"{n_columns} fields in each row, as in the header",
            remedy="export the file again, with texts that hold a comma or a line end in quotes",
            rows=ragged + 1,
        )
    return int(widths.size)


def _widths(body: NDArray[np.uint8], file: str) -> Ints:
    """The number of fields of each row; commas and newlines inside quotes divide nothing (RFC 4180)."""
    divides = _outside_quotes(body, file)
    ends = np.flatnonzero((body == _NEWLINE) & divides)
    commas = np.flatnonzero((body == _COMMA) & divides)
    widths = np.diff(np.searchsorted(commas, ends), prepend=0) + 1
    blank = np.diff(ends, prepend=-1) == 1
    return np.where(blank, 0, widths).astype(np.int64)


def _outside_quotes(body: NDArray[np.uint8], file: str) -> Bools:
    quotes = np.flatnonzero(body == _QUOTE)
    outside = np.ones(body.size, dtype=np.bool_)
    if not quotes.size:
        return outside
    opening, closing = quotes[0::2], quotes[1::2]
    before = np.where(opening == 0, _NEWLINE, body[opening - 1])
    after = body[np.minimum(closing + 1, body.size - 1)]
    borders = (_QUOTE, _COMMA, _NEWLINE)
    if quotes.size % 2 or not (np.isin(before, borders).all() and np.isin(after, borders).all()):
        raise _refused(
            "quotes-misplaced",
            "quotation mark out of place",
            file,
            found="one that is never closed" if quotes.size % 2 else "one inside a field that is not quoted",
            accepted='fields in "double quotes", a quotation mark inside them doubled',
            remedy="export the file again as CSV",
        )
    depth = np.zeros(body.size + 1, dtype=np.int8)
    depth[opening] = 1
    depth[closing] = -1
    return cast(Bools, np.cumsum(depth[:-1], dtype=np.int8) == 0)


def _refused(
    id: str, what: str, where: str, *, found: str, accepted: str, remedy: str, rows: Any = ()
) -> TableRefused:
    return TableRefused(finding(id, "block", what, where, found, accepted, remedy, rows=rows))
