"""The frozen report of a look, as bytes or as files in a folder."""

from __future__ import annotations

import json
import os
import re
from contextlib import suppress
from dataclasses import dataclass
from pathlib import Path

from app.actions.desk import Desk
from app.errors import SetupError
from app.ledger.bodies import ReportWritten
from app.ledger.entries import history_lines
from app.verification import third_party
from app.verification.check import record_text_in_report

VERIFIER = "verify_report.py"


@dataclass(frozen=True)
class ReportFiles:
    """What is written for a frozen look; `stem` names the files without saying anything comparative."""

    html: bytes
    record: bytes
    history: bytes
    environment: bytes
    stem: str

    @property
    def by_name(self) -> dict[str, bytes]:
        """Every file of the folder by its name, with the program by which anyone can check them."""
        return {
            f"{self.stem}.html": self.html,
            f"{self.stem}.record.json": self.record,
            f"{self.stem}.history.jsonl": self.history,
            f"{self.stem}.environment.json": self.environment,
            VERIFIER: Path(third_party.__file__).read_bytes(),
        }


def report(desk: Desk, look: int) -> ReportFiles:
    """The frozen bytes of a look; LedgerError while it is not frozen."""
    state = desk.trial.state()
    freeze = state.frozen_look(look)
    frozen = freeze.body
    html = desk.trial.content(frozen.report_digest)
    environment = json.dumps(frozen.environment, indent=1, sort_keys=True) + "\n"
    return ReportFiles(
        html=html,
        record=record_text_in_report(html),
        history=history_lines(entry for entry in desk.trial.entries() if entry.id <= freeze.head.id),
        environment=environment.encode("utf-8"),
        stem=f"{file_stem(state.name)}-look-{look}-closed-{frozen.disclosure}",
    )


def file_stem(name: str) -> str:
    """The trial's name as a file name may have it on any machine."""
    return re.sub(r"[^A-Za-z0-9]+", "-", name).strip("-") or "trial"


def write_report(desk: Desk, look: int, folder: Path) -> tuple[Path, ...]:
    """Write the files of a frozen look into a folder, each whole or not at all, and record that."""
    wanted = {folder / name: content for name, content in report(desk, look).by_name.items()}
    for path, content in wanted.items():
        write_whole(path, content)
    if desk.may_write:
        with desk.trial.act() as act:
            act.append(ReportWritten(look, act.state.frozen_look(look).body.report_digest))
    return tuple(wanted)


def write_whole(path: Path, content: bytes) -> None:
    """Write beside, then rename, so that no half-written report ever stands under its name."""
    unfinished = path.with_name(f".{path.name}.unfinished")
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        with open(unfinished, "wb") as file:
            os.chmod(unfinished, 0o600)
            file.write(content)
            file.flush()
            os.fsync(file.fileno())
        os.replace(unfinished, path)
    except OSError as fault:
        with suppress(OSError):  # the folder may be none at all
            unfinished.unlink()
        raise SetupError(
            "A report file cannot be written",
            where=str(path),
            found=fault.strerror or type(fault).__name__,
            accepted="a folder that can be written",
            remedy="name another folder with --to",
        ) from fault
