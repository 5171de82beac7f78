"""The published data sets that rows are computed from."""

from __future__ import annotations

import csv
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

import numpy as np

from app.model.values import Bools, Floats, Ints, read_only


@dataclass(frozen=True, eq=False)
class PublishedSample:
    """One row per subject, shape (n,); `arm` as the publication names it."""

    time: Floats
    event: Bools
    arm: tuple[str, ...]
    stratum: Ints

    def is_in(self, arm: str) -> Bools:
        return np.array([name == arm for name in self.arm])


@cache
def published_sample(name: str) -> PublishedSample:
    """The file data_sets/`name`.csv; its leading lines with a # say where it was published."""
    rows = _rows_of(name)
    return PublishedSample(
        time=read_only([float(row["time"]) for row in rows], np.float64),
        event=read_only([row["event"] == "1" for row in rows], np.bool_),
        arm=tuple(row["arm"] for row in rows),
        stratum=read_only([int(row["stratum"]) for row in rows], np.int64),
    )


@dataclass(frozen=True, eq=False)
class PublishedCauses:
    """One row per subject, shape (n,); `cause` 0 is censored, `group` as the publication names it."""

    time: Floats
    cause: Ints
    group: tuple[str, ...]

    def is_in(self, group: str) -> Bools:
        return np.array([name == group for name in self.group])


@cache
def published_causes(name: str) -> PublishedCauses:
    """The file data_sets/`name`.csv, of events of several causes."""
    rows = _rows_of(name)
    return PublishedCauses(
        time=read_only([float(row["time"]) for row in rows], np.float64),
        cause=read_only([int(row["cause"]) for row in rows], np.int64),
        group=tuple(row["group"] for row in rows),
    )


def _rows_of(name: str) -> list[dict[str, str]]:
    text = files("app.validation").joinpath("data_sets", f"{name}.csv").read_text(encoding="utf-8")
    return list(csv.DictReader(line for line in text.splitlines() if not line.startswith("#")))
