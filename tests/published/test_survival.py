"""Curves, medians, log-rank and hazard ratios against print; each row names its publication."""

from __future__ import annotations

import pytest

from app.model.values import Absent
from app.survival import kaplan_meier
from app.validation.rows import PublishedRow
from app.validation.samples import published_sample
from app.validation.shape_rows import shape_rows
from app.validation.survival_rows import survival_rows

ROWS = (*survival_rows(), *shape_rows())


@pytest.mark.parametrize("row", ROWS, ids=lambda row: f"{row.publication[:12]}: {row.quantity}")
def test_value_agrees_with_its_publication_to_the_printed_digits(row: PublishedRow) -> None:
    outcome = row.check()
    assert outcome.agrees, f"{row.publication}: {row.quantity} is {row.expected}, computed {outcome.computed}"


@pytest.mark.parametrize("kind", ["plain", "log", "log-log"])
def test_upper_limit_of_the_6_mp_median_is_not_reached(kind: str) -> None:
    # Freireich et al. (1963); computed independently with R: 23 (16, NA) log, else 23 (13, NA)
    sample = published_sample("leukaemia_remission")
    chosen = sample.is_in("6-MP")
    curve = kaplan_meier(sample.time[chosen], sample.event[chosen], interval=kind)
    assert curve.median_ci_high == Absent("not reached")


@pytest.mark.parametrize(
    ("name", "counts"),
    [  # subjects and events of each arm, as the publications say
        ("leukaemia_remission", {"6-MP": (21, 9), "placebo": (21, 21)}),
        ("dialysis_catheters", {"surgical": (43, 15), "percutaneous": (76, 11)}),
        ("breast_cancer_staining", {"negative": (13, 5), "positive": (32, 21)}),
        ("lung_cancer", {"male": (138, 112), "female": (90, 53)}),
        ("lung_cancer_veterans", {"standard": (69, 64), "test": (68, 64)}),
        ("ovarian_cancer", {"one": (13, 7), "two": (13, 5)}),
        ("primary_biliary_cirrhosis", {"D-penicillamine": (158, 65), "placebo": (154, 60)}),
    ],
)
def test_data_set_has_the_published_numbers_of_subjects_and_events(
    name: str, counts: dict[str, tuple[int, int]]
) -> None:
    sample = published_sample(name)
    found = {
        arm: (int(sample.is_in(arm).sum()), int(sample.event[sample.is_in(arm)].sum()))
        for arm in set(sample.arm)
    }
    assert found == counts
