"""Check closed reports with Python's standard library alone: no trial file, no other program.

    python3 verify_report.py [FOLDER] [HEAD ...]

Python 3.9 or later. For each report in the folder (this one, when none is named): the exported history
beside it is one chain, in which every line holds the SHA-256 of the line before; its last line is the freeze
of this very report, by the report's SHA-256; the report prints the head before its freeze; the record in the
report is the one whose SHA-256 it prints, is the record beside it, and rests on a plan and files that the
history names. Each HEAD is a head that was kept elsewhere, such as in the committee's minutes: the history
must hold it.

What this cannot prove: that nobody wrote a report and its history anew together. Only a HEAD kept elsewhere
can.
"""

from __future__ import annotations

import hashlib
import html
import json
import re
import sys
from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import Any

Line = tuple[bool, str]
RECORD = re.compile(rb'<pre[^>]*\bid="record"[^>]*>(.*?)</pre>', re.DOTALL)
PRINTED = {
    "head": re.compile(rb"<dt>Chain head before this freeze</dt><dd>([0-9a-f]{64})</dd>"),
    "record": re.compile(rb"<dt>Record</dt><dd>SHA-256 ([0-9a-f]{64})</dd>"),
}
BEFORE_THE_FIRST = "0" * 64
DIGEST = re.compile("[0-9a-f]{64}")


def sha256(content: bytes) -> str:
    return hashlib.sha256(content).hexdigest()


def printed(report: bytes, what: str) -> str:
    """The digest that the report prints under this heading, once; else nothing."""
    found = PRINTED[what].findall(report)
    return found[0].decode() if len(found) == 1 else ""


def record_text(report: bytes) -> bytes:
    found = RECORD.search(report)
    return html.unescape(found.group(1).decode("utf-8")).encode("utf-8") if found else b""


def read_history(content: bytes) -> tuple[list[dict[str, Any]], list[str]]:
    """The entries of an exported history and the digests of its lines; ValueError where it is broken."""
    entries: list[dict[str, Any]] = []
    digests = [BEFORE_THE_FIRST]
    for number, line in enumerate(content.splitlines(), 1):
        entry = json.loads(line.decode("utf-8"))
        if entry["id"] != number:
            raise ValueError(f"line {number} is entry {entry['id']}, lines are missing")
        if entry["previous"] != digests[-1]:
            raise ValueError(f"line {number} does not follow the line before it as that stands now")
        entries.append(entry)
        digests.append(sha256(line))
    if not entries or entries[-1]["kind"] != "look frozen":
        raise ValueError("its last line is no freeze")
    return entries, digests[1:]


def check_history(content: bytes, report: bytes, heads: Sequence[str]) -> Iterator[Line]:
    """About a history and the report whose freeze is its last entry."""
    try:
        entries, digests = read_history(content)
        last, freeze = entries[-1], entries[-1]["body"]
        frozen, head_before = freeze["report_digest"], freeze["head_before"]
    except (ValueError, KeyError, TypeError) as fault:
        yield False, f"The history is no chain that ends in a freeze: {fault}."
        return
    yield True, f"The history is one chain of {len(entries)} entries."
    yield frozen == sha256(report), "Its last entry is the freeze of this report, by the report's SHA-256."
    is_before = head_before == last["previous"] == printed(report, "head")
    yield is_before, f"The report prints the head before its freeze, {head_before}."
    yield True, f"The head after its freeze is {digests[-1]}."
    for head in heads:
        found = (
            f"entry {digests.index(head) + 1}" if head in digests else "no entry: cut off, or written anew"
        )
        yield head in digests, f"The head kept elsewhere, {head}, is that of {found}."
    yield from check_origin(entries, json.loads(record_text(report).decode("utf-8") or "{}"))


def check_origin(entries: list[dict[str, Any]], record: dict[str, Any]) -> Iterator[Line]:
    """Whether the record rests on a plan and on files that the history names."""
    plans = [entry["body"].get("plan_digest") for entry in entries if entry["kind"].startswith("plan ")]
    yield record.get("plan_digest") in plans, "The record rests on a plan that the history names."
    look = entries[-1]["body"].get("look")
    bodies = [entry["body"] for entry in entries if entry["kind"] == "snapshot received"]
    files = [[file["digest"] for file in body["files"]] for body in bodies if body["number"] == look]
    yield [record.get("snapshot_digests")] == files, "It rests on the files that the history names."


def check_record(report: bytes, beside: bytes | None) -> Iterator[Line]:
    """About the record in a report: by the digest that the report prints, and against the copy beside it."""
    text = record_text(report)
    is_printed = bool(text) and sha256(text) == printed(report, "record")
    yield is_printed, "The record in the report is the one whose SHA-256 the report prints."
    if beside is not None:
        yield beside == text, "The record beside the report is the same."


def check_folder(folder: Path, heads: Sequence[str] = ()) -> Iterator[tuple[str, bool, str]]:
    """Every report in the folder, line by line: its name, whether the check passed, and what was checked."""
    for path in sorted(folder.glob("*.html")):
        report = path.read_bytes()
        record, history = path.with_suffix(".record.json"), path.with_suffix(".history.jsonl")
        lines = list(check_record(report, record.read_bytes() if record.is_file() else None))
        if history.is_file():
            lines += check_history(history.read_bytes(), report, heads)
        else:
            lines.append((not heads, "No history lies beside it, so that its own record alone was checked."))
        for passed, words in lines:
            yield path.name, passed, words


def main(words: Sequence[str]) -> int:
    heads = [word.lower() for word in words if DIGEST.fullmatch(word.lower())]
    folders = [word for word in words if not DIGEST.fullmatch(word.lower())]
    folder = Path(folders[0]) if folders else Path(__file__).resolve().parent
    lines = list(check_folder(folder, heads))
    for name, passed, said in lines:
        sys.stdout.write(f"{'ok    ' if passed else 'FAILED'}  {name}: {said}\n")
    if not lines:
        sys.stdout.write(f"FAILED  {folder}: no report (.html) is here.\n")
    return 0 if lines and all(passed for _, passed, _ in lines) else 1


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
