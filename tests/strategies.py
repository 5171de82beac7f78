"""Samples for the property tests."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from hypothesis import strategies as st

from app.model.values import Bools, Floats, Ints


@dataclass(frozen=True, eq=False)
class TwoArmSample:
    """One row per subject, as the estimators take them."""

    time: Floats
    event: Bools
    experimental: Bools
    stratum: Ints

    @property
    def size(self) -> int:
        return self.time.size

    def rows(self, order: Ints) -> TwoArmSample:
        """The subjects at these positions, in this order."""
        return TwoArmSample(
            self.time[order], self.event[order], self.experimental[order], self.stratum[order]
        )

    def but(self, **columns: object) -> TwoArmSample:
        return replace(self, **columns)  # type: ignore[arg-type]


whole_days = st.integers(0, 12).map(float)  # few values, so that ties abound
eighths = st.integers(0, 60).map(lambda k: k / 8)  # exact in binary, not whole
any_time = st.floats(0.0, 1e4, allow_subnormal=False)


@st.composite
def two_arm_samples(draw: st.DrawFn, times: st.SearchStrategy[float] | None = None) -> TwoArmSample:
    """Up to 40 subjects in two arms and three strata, of which any may be empty; ties of every kind."""
    size = draw(st.integers(1, 40))
    one_kind = draw(st.sampled_from([whole_days, eighths, any_time])) if times is None else times

    def column(values: st.SearchStrategy[object]) -> list[object]:
        return draw(st.lists(values, min_size=size, max_size=size))

    return TwoArmSample(
        time=np.array(column(one_kind), dtype=np.float64),
        event=np.array(column(st.booleans()), dtype=np.bool_),
        experimental=np.array(column(st.booleans()), dtype=np.bool_),
        stratum=np.array(column(st.integers(0, 2)), dtype=np.int64),
    )
