"""What a form sent, read into memory: an upload never touches the disk before it is received."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Annotated

from fastapi import Depends, Request
from python_multipart.exceptions import FormParserError
from python_multipart.multipart import parse_options_header
from starlette.datastructures import UploadFile
from starlette.exceptions import HTTPException
from starlette.formparsers import FormParser, MultiPartException, MultiPartParser

from app.actions.desk import UploadedFile

MAX_FILES = 20
MAX_FIELDS = 500
LONGEST_ANSWER = 2000


class InMemoryParser(MultiPartParser):
    """The body limit bounds what can come, so nothing is ever spooled to a file."""

    spool_max_size = 2**40


@dataclass(frozen=True)
class Submitted:
    """The fields and files of one form; a field that was not sent reads as empty."""

    fields: Mapping[str, str]
    files: tuple[UploadedFile, ...] = field(default=())

    def text(self, name: str) -> str:
        """One line of text as a person meant it: no control characters, no surrounding or doubled blanks."""
        return " ".join(re.sub(r"[\x00-\x1f\x7f]", " ", self.fields.get(name, "")).split())[:LONGEST_ANSWER]

    def is_ticked(self, name: str) -> bool:
        return self.fields.get(name) == "yes"

    def under(self, prefix: str) -> dict[str, str]:
        """The answered fields whose names begin with `prefix`, by the rest of their names."""
        names = [name for name in self.fields if name.startswith(prefix)]
        return {name[len(prefix) :]: self.text(name) for name in names if self.text(name)}


async def submitted(request: Request) -> Submitted:
    """Read the form that a request carries; anything else reads as a form without answers."""
    kind, options = parse_options_header(request.headers.get("content-type"))
    if options.get(b"charset", b"utf-8").lower() != b"utf-8":  # no page of ours sends another one
        raise HTTPException(400, detail="a form in another character set than UTF-8")
    parser = parser_of(kind, request)
    if parser is None:
        return Submitted({})
    try:
        return read_into_memory((await parser.parse()).multi_items())
    except MultiPartException as refusal:
        raise HTTPException(400, detail=refusal.message) from refusal
    except FormParserError as refusal:
        raise HTTPException(400, detail="a form that breaks off or has no boundary") from refusal


def parser_of(kind: bytes, request: Request) -> InMemoryParser | FormParser | None:
    if kind == b"multipart/form-data":
        return InMemoryParser(request.headers, request.stream(), max_files=MAX_FILES, max_fields=MAX_FIELDS)
    if kind == b"application/x-www-form-urlencoded":
        return FormParser(request.headers, request.stream(), max_fields=MAX_FIELDS)
    return None


def read_into_memory(items: list[tuple[str, str | UploadFile]]) -> Submitted:
    fields: dict[str, str] = {}
    files: list[UploadedFile] = []
    for name, value in items:
        if isinstance(value, str):
            fields[name] = value
        else:
            with value.file as file:
                content = file.read()
            if value.filename:  # a file field left empty is sent without a name
                files.append(UploadedFile(file_name(value.filename), content))
    return Submitted(fields, tuple(files))


def file_name(sent: str) -> str:
    """The last part of the name a browser sent, whatever its separators, without control characters."""
    return re.sub(r"[\x00-\x1f\x7f]", "", re.split(r"[/\\]", sent)[-1])[:200] or "unnamed"


SubmittedForm = Annotated[Submitted, Depends(submitted)]
