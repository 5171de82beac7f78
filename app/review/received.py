"""One received snapshot under its plan: read, compared with the one before, computed."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from datetime import date

from app.errors import InputError
from app.intake.extract import read_extract
from app.intake.samples import changes, read_pooled
from app.model.boundary import HeldCompared, LookAsUsed
from app.model.extract import Changes, Extract, LookKind, ReceivedFile, Sample
from app.model.look import LookResult, PooledResult
from app.model.plan import Plan
from app.review.endpoints import review_look
from app.review.look import LookDeclared
from app.review.pooled import review_pooled
from app.settings import Limits


@dataclass(frozen=True)
class Delivery:
    """The files of one extract with what was declared about them."""

    files: tuple[ReceivedFile, ...]
    kind: LookKind
    cutoff: date | None = None
    extracted: date | None = None

    @property
    def digests(self) -> tuple[str, ...]:
        return tuple(file.digest for file in self.files)


@dataclass(frozen=True, eq=False)
class Reviewed:
    """An extract as understood and what it says."""

    extract: Extract
    result: LookResult


def understand_delivery(plan: Plan, delivery: Delivery, limits: Limits) -> Extract:
    return read_extract(delivery.files, plan, cutoff=delivery.cutoff, limits=limits)


def usable_sample(extract: Extract) -> Sample:
    """The sample, or the sentences of every finding that blocks as one InputError."""
    if extract.sample is None:
        raise SnapshotBlocked(tuple(str(finding) for finding in extract.blocking))
    return extract.sample


class SnapshotBlocked(InputError):
    """An extract that cannot be used; `sentences` say why, one a blocking finding."""

    def __init__(self, sentences: tuple[str, ...]) -> None:
        self.sentences = sentences
        super().__init__(sentences[0].rstrip("."))

    def __str__(self) -> str:
        return "\n".join(self.sentences)


def changes_between(plan: Plan, earlier: Delivery, sample: Sample, limits: Limits) -> Changes:
    """What differs between an accepted earlier delivery and this sample."""
    return changes(usable_sample(understand_delivery(plan, earlier, limits)), sample)


def review_delivery(
    plan: Plan,
    delivery: Delivery,
    earlier: Delivery | None,
    past: Sequence[LookAsUsed],
    *,
    number: int,
    limits: Limits,
    held: Sequence[HeldCompared] = (),
) -> Reviewed:
    """Read and compute one look; `earlier` is the delivery before it and `past` the looks as used.

    `held` are those of `past` that have no delivery, beside what we compute for them.
    """
    extract = understand_delivery(plan, delivery, limits)
    sample = usable_sample(extract)
    declared = LookDeclared(
        number=number,
        kind=delivery.kind,
        cutoff=delivery.cutoff,
        extracted=delivery.extracted,
        findings=extract.findings,
        changes=None if earlier is None else changes_between(plan, earlier, sample, limits),
        snapshot_digests=delivery.digests,
    )
    result = review_look(plan, sample, declared, past, extract.further)
    return Reviewed(extract, replace(result, held=tuple(held)))


def pool_delivery(
    plan: Plan, delivery: Delivery, past: Sequence[tuple[int, float, int]], *, number: int, limits: Limits
) -> PooledResult:
    """The open side's look: read again without the arm column, never derived from the closed one."""
    declared = LookDeclared(number, delivery.kind, delivery.cutoff, delivery.extracted)
    return review_pooled(plan, read_pooled(delivery.files, plan, limits=limits), declared, past)
