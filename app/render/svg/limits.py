"""The bounds of a look as they are read: in one reading, or mirrored in two while masked."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Literal

Kind = Literal["efficacy", "harm", "futility"]


@dataclass(frozen=True)
class Limit:
    """A bound: its place on the axis of z, whether its zone lies above, and what it is a bound of."""

    z: float
    above: bool
    kind: Kind


Limits = tuple[Limit, ...]


def limits_read(
    upper: float | None,
    lower: float | None,
    harm: float | None,
    futility: float | None,
    *,
    masked: bool,
) -> tuple[Limits, ...]:
    """The limits of each reading; masked, as if A were experimental and, mirrored, as if B were."""
    efficacy, other = _limit(upper, True, "efficacy"), _limit(lower, False, "efficacy")
    own = (*_limit(harm, False, "harm"), *_limit(futility, False, "futility"))
    if not masked:
        return ((*efficacy, *other, *own),)
    mirrored = tuple(replace(limit, z=-limit.z, above=True) for limit in own)
    return (*efficacy, *own), (*other, *mirrored)


def _limit(z: float | None, above: bool, kind: Kind) -> Limits:
    return () if z is None else (Limit(z, above, kind),)


def is_reached(z: float | None, limit: Limit) -> bool:
    """Whether z stands at or beyond a bound that is drawn as a solid bar; futility only hatches."""
    if z is None or limit.kind == "futility":
        return False
    return z >= limit.z if limit.above else z <= limit.z
