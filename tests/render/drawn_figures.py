"""Every figure the tests look at, and a reader of what was drawn."""

from __future__ import annotations

from dataclasses import dataclass, replace
from xml.etree import ElementTree

from app.render import figures
from app.render.svg import strips
from app.render.svg.lettering import text_width
from app.sheets.blocks import (
    ArmLabel,
    BoundaryFigure,
    ChancesFigure,
    CurvesFigure,
    Lane,
    LaneRow,
    LogLogFigure,
    Span,
    ZStrip,
)
from tests.render import invented_book as invented

SVG = "{http://www.w3.org/2000/svg}"
HARM = (-2.356, -2.363, -2.390, -2.335)
HOSTILE = "<script>alert('1')</script>&\"]]>\x00\x0b</svg>"


def boundary_at(
    fractions: list[float], *, now: int, two_lanes: bool = False, final_z: float = 1.2
) -> BoundaryFigure:
    """A boundary figure whose looks fall anywhere: many, close together, early, or over 1."""
    template = invented.boundary_figure("masked" if two_lanes else "not crossed")
    bounds = [min(8.0, 2.0 / fraction**0.5) for fraction in fractions]
    lanes = tuple(
        Lane(
            look=look,
            fraction=fraction,
            state="past" if look < now else "now" if look == now else "planned",
            final=False,
            z=invented.n(final_z * fraction) if look <= now else None,
            upper=invented.n(bound),
            lower=invented.n(-bound) if two_lanes else None,
        )
        for look, (fraction, bound) in enumerate(zip(fractions, bounds, strict=True), start=1)
    )
    cells = [tuple(invented.n(value) for value in fractions), tuple(invented.n(value) for value in bounds)]
    rows = tuple(
        replace(row, cells=each)
        for row, each in zip((template.rows[0], template.rows[3]), cells, strict=True)
    )
    return replace(template, lanes=lanes, rows=rows)


def two_sided() -> BoundaryFigure:
    figure = invented.boundary_figure("not crossed")
    lanes = tuple(
        replace(
            lane, lower=replace(lane.upper, text=f"−{lane.upper.text}") if lane.upper else None, futility=None
        )
        for lane in figure.lanes
    )
    return replace(figure, lanes=lanes)


def with_hostile_names() -> CurvesFigure:
    figure = invented.curves_figure()
    arm = ArmLabel("A", HOSTILE, HOSTILE)
    lines = tuple(replace(line, arm=arm, label=HOSTILE) for line in figure.lines)
    return replace(figure, title=HOSTILE, description=HOSTILE, x_title=HOSTILE, y_title=HOSTILE, lines=lines)


def with_long_names() -> CurvesFigure:
    figure = invented.curves_figure()
    lines = tuple(
        replace(line, label="Extended-release tablet with titration and counselling (B)")
        for line in figure.lines
    )
    return replace(figure, lines=lines)


def with_harm(state: invented.State, *, z: float | None = None) -> BoundaryFigure:
    """The figure with a harm bound at each look and its row; the look shown at this z, then crossed."""
    figure = invented.boundary_figure(state)
    lanes = tuple(replace(lane, harm=invented.n(HARM[lane.look - 1])) for lane in figure.lanes)
    if z is not None:
        shown = (
            replace(lane, z=invented.n(z), crossed=True) if lane.state == "now" else lane for lane in lanes
        )
        lanes = tuple(shown)
    words = invented.text("Harm bound")
    row = LaneRow(words, words, tuple(map(invented.n, HARM)))
    return replace(figure, lanes=lanes, rows=(*figure.rows[:-1], row, figure.rows[-1]))


def z_strip_with_harm(
    state: invented.State, z: float, *, futility: float = 0.958, upper: float = 2.434
) -> ZStrip:
    strip = invented.z_strip(state)
    crossed = z <= HARM[2] or z >= -HARM[2] or 0 < z <= futility
    bounds = {"upper": invented.n(upper), "harm": invented.n(HARM[2]), "futility": invented.n(futility)}
    return replace(strip, z=invented.n(z), crossed=crossed, **bounds)


def without_a_chance() -> ChancesFigure:
    figure = invented.chances_figure("masked")
    first, *others = figure.chances
    return replace(figure, chances=(replace(first, percent=Span("not estimable")), *others))


def with_long_log_log_names() -> LogLogFigure:
    figure = invented.log_log_figure()
    names = ("Extended-release tablet with titration", "Matching placebo capsule")
    lines = tuple(
        replace(line, arm=replace(line.arm, name=name))
        for line, name in zip(figure.lines, names, strict=True)
    )
    return replace(figure, lines=lines)


FIGURES = {
    "boundary": invented.boundary_figure("not crossed"),
    "boundary crossed": invented.boundary_figure("crossed"),
    "boundary masked": invented.boundary_figure("masked"),
    "boundary two-sided": two_sided(),
    "boundary at its first look": boundary_at([0.08, 0.5, 1.0], now=1),
    "boundary at twenty looks": boundary_at([look / 20 for look in range(1, 21)], now=9),
    "boundary at close looks": boundary_at([0.48, 0.5, 0.505, 1.0], now=3),
    "boundary run over": boundary_at([0.4, 0.8, 1.13], now=3),
    "boundary masked at ten looks": boundary_at([look / 10 for look in range(1, 11)], now=4, two_lanes=True),
    "boundary with long names": replace(
        invented.boundary_figure("not crossed"),
        favours_up="favours extended-release tablet with titration and counselling",
        favours_down=f"favours {HOSTILE}",
        y_title=(
            Span("z", "symbol"),
            Span(
                ", extended-release tablet with titration and counselling "
                "against a matching placebo tablet once a day"
            ),
        ),
    ),
    "boundary with harm": with_harm("not crossed"),
    "boundary with harm crossed": with_harm("not crossed", z=-2.5),
    "boundary masked with harm": with_harm("masked"),
    "boundary masked with harm crossed": with_harm("masked", z=2.4),
    "curves": invented.curves_figure(),
    "curves masked": invented.curves_figure("masked"),
    "curves pooled": invented.pooled_curves_figure(),
    "curves with long names": with_long_names(),
    "curves with hostile names": with_hostile_names(),
    "calendar": invented.calendar_figure(),
    "log-log": invented.log_log_figure(),
    "log-log masked": invented.log_log_figure("masked"),
    "log-log with long names": with_long_log_log_names(),
    "residuals": invented.residual_figure(),
    "residuals masked": invented.residual_figure("masked"),
    "residuals of few events": invented.residual_figure(events=60),
    "residuals with long names": replace(
        invented.residual_figure(),
        favours_up="favours extended-release tablet with titration and counselling",
        favours_down=f"favours {HOSTILE}",
        y_title="Hazard ratio of a tablet with a long name against another with a longer one, log scale",
    ),
    "counts": invented.counts_figure(),
    "chances": invented.chances_figure("not crossed"),
    "chances masked": invented.chances_figure("masked"),
    "chances without a number": without_a_chance(),
}
HALVES = [name for name in FIGURES if name.startswith(("log-log", "residuals"))]
STRIPS = {
    "counts strip": invented.counts_figure(),
    "information strip": invented.information_strip(),
    "information strip run over": replace(
        invented.information_strip(), held=((0.5, Span("269")), (0.97, Span("522")), (1.08, Span("581")))
    ),
    "interval strip": invented.interval_strip(),
    "z strip": invented.z_strip("not crossed"),
    "z strip crossed": invented.z_strip("crossed"),
    "z strip masked": invented.z_strip("masked"),
    "z strip with harm": z_strip_with_harm("not crossed", -0.5),
    "z strip with harm crossed": z_strip_with_harm("not crossed", -2.5),
    "z strip with futility crossed": z_strip_with_harm("not crossed", 0.2),
    "z strip with harm, early": z_strip_with_harm("not crossed", 0.9, futility=-0.799, upper=4.241),
    "z strip masked with harm crossed": z_strip_with_harm("masked", 2.4),
}


def drawings() -> dict[str, str]:
    """Every drawing by name, drawn afresh."""
    drawn = {}
    for name, figure in FIGURES.items():
        drawn[f"{name}, wide"] = str(figures.wide(figure))
        drawn[f"{name}, narrow"] = str(figures.narrow(figure))
    for name in HALVES:
        drawn[f"{name}, half"] = str(figures.half(FIGURES[name]))
    for name, strip in STRIPS.items():
        drawn[f"{name}, wide"] = str(strips.wide(strip))
        drawn[f"{name}, narrow"] = str(strips.narrow(strip))
    return drawn


@dataclass(frozen=True)
class Text:
    """A line of text as it stands in a drawing."""

    words: str
    x: float
    y: float
    size: float
    anchor: str
    semibold: bool

    @property
    def left(self) -> float:
        width = text_width(self.words, self.size, semibold=self.semibold)
        return self.x - {"start": 0.0, "middle": width / 2, "end": width}[self.anchor]

    @property
    def right(self) -> float:
        return self.left + text_width(self.words, self.size, semibold=self.semibold)

    def overlaps(self, other: Text) -> bool:
        """Whether inked parts meet: from the baseline up to the capitals."""
        apart_across = self.right <= other.left + 0.5 or other.right <= self.left + 0.5
        apart_upwards = self.y <= other.y - 0.66 * other.size or other.y <= self.y - 0.66 * self.size
        return not (apart_across or apart_upwards)


def texts(svg: str) -> list[Text]:
    return [
        Text(
            "".join(element.itertext()),
            float(element.get("x", "0")),
            float(element.get("y", "0")),
            float(element.get("font-size", "13")),
            element.get("text-anchor", "start"),
            element.get("font-weight") == "600",
        )
        for element in ElementTree.fromstring(svg).iter(f"{SVG}text")
    ]
