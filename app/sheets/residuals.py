"""The second figure of the Shape sheet: the hazard ratio over time, as scaled residuals show it."""

from __future__ import annotations

import math

import numpy as np

from app.model.survival import CoxResult, RatioOverTime, ScaledResiduals
from app.model.values import Absent
from app.sheets.arms import labels
from app.sheets.axis import display_unit, ticks_up_to
from app.sheets.blocks import Cell, Column, ResidualFigure, Row, SmoothPoint, Table
from app.sheets.curves import against, in_unit
from app.sheets.words import DESCRIPTIVE, count, interval, level_text, line, number
from app.views.closed import ClosedView

TABLE_ROWS = 5
MOST_RATIO_TICKS = 12


def residual_figure(view: ClosedView) -> ResidualFigure | None:
    """None where there is no smooth to draw, or no one ratio to hold it against."""
    known = _known(view)
    if isinstance(known, Absent):
        return None
    residuals, ratio, cox = known
    unit, scale = display_unit(view.look.time_unit)
    times, heights = (residuals.time / scale).tolist(), residuals.residuals[:, 0].tolist()
    smooth = _smooth(ratio, scale)
    up, down = _favours(view)
    return ResidualFigure(
        title=f"Hazard ratio over time, {against(view)}, {DESCRIPTIVE}",
        description=f"A mark for each event over {unit}, a smooth line through them with its limits, and the "
        "one hazard ratio for all times as a dashed line. The smooth is said in the table.",
        x_title=f"{unit.capitalize()} since randomisation",
        y_title="Hazard ratio, log scale",
        x_ticks=tuple((tick, f"{tick:.4g}") for tick in ticks_up_to(times[-1], unit)),
        y_ticks=_ratio_ticks([*heights, *(end for each in smooth for end in (each.low, each.high))]),
        points=tuple(zip(times, heights, strict=True)),
        smooth=smooth,
        constant=cox.log_hazard_ratio,
        constant_words=number(cox.hazard_ratio, 3),
        favours_up=up,
        favours_down=down,
    )


def _known(view: ClosedView) -> tuple[ScaledResiduals, RatioOverTime, CoxResult] | Absent:
    """What is drawn, or why nothing is."""
    residuals, ratio, cox = view.shape.residuals, view.shape.ratio_over_time, view.cox
    if isinstance(residuals, Absent):
        return residuals
    if isinstance(ratio, Absent):
        return ratio
    return cox if isinstance(cox, Absent) else (residuals, ratio, cox)


def _smooth(ratio: RatioOverTime, scale: float) -> tuple[SmoothPoint, ...]:
    rows = zip(
        (ratio.time / scale).tolist(),
        ratio.log_hazard_ratio.tolist(),
        np.log(ratio.ci_low).tolist(),
        np.log(ratio.ci_high).tolist(),
        strict=True,
    )
    return tuple(SmoothPoint(*row) for row in rows)


def _favours(view: ClosedView) -> tuple[str, str]:
    """Whom a ratio above 1 favours, and whom one below: more of a bad event speaks against its arm."""
    of, other = (f"favours {label.in_sentence}" for label in labels(view))
    return (other, of) if view.plan.endpoint.event_is == "bad" else (of, other)


def _ratio_ticks(heights: list[float]) -> tuple[tuple[float, str], ...]:
    """Ratios 1, 2, 5 in each power of ten, or powers alone where those would crowd; 1 is always there."""
    low, high = (end / math.log(10) for end in (min(0.0, *heights), max(0.0, *heights)))
    if high - low > MOST_RATIO_TICKS / 3:
        step = math.ceil((high - low) / MOST_RATIO_TICKS)
        powers = range(math.ceil(low / step), math.floor(high / step) + 1)
        return tuple((step * power * math.log(10), f"1e{step * power}") for power in powers)
    ratios = (digit * 10.0**power for power in range(-5, 6) for digit in (1, 2, 5))
    return tuple((math.log(r), f"{r:g}") for r in ratios if low <= math.log10(r) <= high)


def residual_words(view: ClosedView) -> str:
    """What marks and line are, or why they are not there."""
    known = _known(view)
    if isinstance(known, Absent):
        return f"The hazard ratio over time is not drawn: {known.reason}."
    return "Marks are events’ scaled residuals; the smooth, along 1 − Kaplan-Meier, is no test."


def residual_table(view: ClosedView) -> Table | None:
    """The smooth at a few times: what a line says that a mark for each event does not."""
    known = _known(view)
    if isinstance(known, Absent):
        return None
    _, ratio, _ = known
    unit, scale = display_unit(view.look.time_unit)
    chosen = np.linspace(0, ratio.time.size - 1, TABLE_ROWS).round().astype(int).tolist()
    level = level_text(ratio.level)
    return Table(
        caption=line(f"Smoothed hazard ratio, {against(view)}, pointwise {level} limits, {DESCRIPTIVE}"),
        columns=(Column(line("Events so far")), Column(line("Hazard ratio"))),
        rows=tuple(
            Row(
                line(in_unit(float(ratio.time[at]), scale)),
                (
                    Cell(line(count(int(ratio.events[at])))),
                    Cell(
                        line(number(float(ratio.hazard_ratio[at]), 3)),
                        interval(float(ratio.ci_low[at]), float(ratio.ci_high[at]), 3),
                    ),
                ),
            )
            for at in chosen
        ),
        corner=line(unit.capitalize()),
    )
