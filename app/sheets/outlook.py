"""Sheet 6, Outlook: what if we go on?"""

from __future__ import annotations

from app.model.outlook import ConditionalPower, NextLook, Outlook, Stopping
from app.model.values import Absent, Estimate
from app.sheets.blocks import Cell, Chance, ChancesFigure, Column, Line, Row, Sheet, Span, Table
from app.sheets.curves import cox_level
from app.sheets.methods import methods
from app.sheets.words import (
    NO_BREAK,
    P,
    Z,
    count,
    interval,
    level_text,
    line,
    number,
    or_dash,
    p_values,
    percent,
)
from app.views.closed import ClosedView
from app.views.reading import Reading

QUESTION = "What if we go on?"
EFFECTS = (
    ("design", "The plan’s ratio", False),
    ("trend", "The trend so far", False),
    ("trend_low", "less favourable", True),
    ("trend_high", "more favourable", True),
    ("null", "No effect", False),
)
"""Effects, their words, and whether they are a limit of the one before."""
ALONG = "Conditional power along the planned looks"


def outlook_sheet(view: ClosedView) -> Sheet:
    """While a reading goes on, what is said of ending here stands behind a fold."""
    stopping = _stopping_tables(view)
    folded = bool(going_on(view))
    return Sheet(
        key="outlook",
        number=6,
        name="Outlook",
        question=QUESTION,
        answer=tuple(_answer(view, reading) for reading in view.readings),
        figure=_figure(view),
        tables=(*_next_look_table(view), *_predictive_table(view), *(() if folded else stopping)),
        folded=stopping if folded else (),
        wide_tables=_power_table(view),
        notes=_notes(view),
        methods=methods("conditional-power", "predictive-power", "next-look", "after-a-stop"),
        figure_table=_figure_table(view),
    )


def going_on(view: ClosedView) -> list[tuple[Reading, Outlook]]:
    """The readings in which a look is still to come, with what it holds."""
    return [
        (reading, reading.onwards.outlook)
        for reading in view.readings
        if not isinstance(reading.onwards.outlook, Absent)
    ]


def _start(view: ClosedView, reading: Reading) -> str:
    return f"If {reading.experimental} is experimental: " if view.masked else ""


# --- the sentence ---------------------------------------------------------------------------------------


def _answer(view: ClosedView, reading: Reading) -> Line:
    """ "... at a look to come is 56.3% under the plan's hazard ratio and 32.3% under the trend so far." """
    outlook = reading.onwards.outlook
    if isinstance(outlook, Absent):
        return line(_start(view, reading), f"{_capital(outlook.reason, view)}.")
    design, trend = percent(outlook.design.path), percent(outlook.trend.path)
    if view.masked:
        return line(_start(view, reading), design, "% under the plan’s effect, ", trend, "% under the trend.")
    start = "The chance of crossing at a look to come is "
    return line(start, design, "% under the plan’s effect, ", trend, "% under the trend.")


def _capital(reason: str, view: ClosedView) -> str:
    return reason if view.masked else reason[:1].upper() + reason[1:]


# --- the figure -----------------------------------------------------------------------------------------


def _figure(view: ClosedView) -> ChancesFigure | None:
    """A strip for each effect and reading; the limits of the trend are the ends of a line through it."""
    outlooks = going_on(view)
    if not outlooks:
        return None
    chances = (
        _chance(effect, said, f"if {reading.experimental}" if view.masked else "", outlook)
        for effect, said, is_limit in EFFECTS
        if not is_limit
        for reading, outlook in outlooks
    )
    return ChancesFigure(
        title=ALONG,
        description="The probability, in percent, of crossing the efficacy bound at a look to come. Through "
        "the trend so far runs a line from its less to its more favourable limit.",
        unit="percent, along the looks",
        short_unit="percent",
        chances=tuple(chances),
    )


def _chance(effect: str, said: str, reading: str, outlook: Outlook) -> Chance:
    shown = percent(getattr(outlook, effect).path)
    if effect != "trend":
        return Chance(said, reading, shown)
    return Chance(said, reading, shown, percent(outlook.trend_low.path), percent(outlook.trend_high.path))


def _figure_table(view: ClosedView) -> Table | None:
    figure = _figure(view)
    if figure is None:
        return None
    heads = ("percent", "at its less favourable limit", "at its more favourable limit")
    rows = tuple(_chance_row(chance) for chance in figure.chances)
    return Table(line(figure.title), tuple(Column(line(head)) for head in heads), rows, line("Chance"))


def _chance_row(chance: Chance) -> Row:
    head = ", ".join(filter(None, (chance.effect, chance.reading)))
    spans = (chance.percent, chance.low, chance.high)
    return Row(line(head), tuple(Cell(() if span is None else (span,)) for span in spans))


# --- the tables -----------------------------------------------------------------------------------------


def _power_table(view: ClosedView) -> tuple[Table, ...]:
    """A row an effect; for each reading a column each of its ratio and of the three conditional powers."""
    outlooks = going_on(view)
    if not outlooks:
        return ()
    obeyed = outlooks[0][1].design.path_futility_obeyed is not None
    names = ("hazard ratio", "final look only", "along the looks", "futility obeyed")[: 4 if obeyed else 3]
    return (
        Table(
            caption=line("Conditional power, percent"),
            columns=tuple(
                Column(line(f"{name}, if {reading.experimental}" if view.masked else name))
                for reading, _ in outlooks
                for name in names
            ),
            rows=tuple(
                Row(line(said), _effect_cells(effect, [outlook for _, outlook in outlooks]), indent)
                for effect, said, indent in EFFECTS
            ),
            corner=line("Were the truth"),
        ),
    )


def _effect_cells(effect: str, outlooks: list[Outlook]) -> tuple[Cell, ...]:
    return tuple(cell for outlook in outlooks for cell in power_cells(getattr(outlook, effect)))


def power_cells(power: ConditionalPower) -> tuple[Cell, ...]:
    chances: list[Estimate] = [power.final_look, power.path]
    if power.path_futility_obeyed is not None:
        chances.append(power.path_futility_obeyed)
    return (Cell((number(power.hazard_ratio, 3),)), *(Cell((percent(chance),)) for chance in chances))


def _next_look_table(view: ClosedView) -> tuple[Table, ...]:
    """What the next planned look needs; masked, what is new depends on the reading."""
    ahead = [
        (reading, outlook.next_look) for reading, outlook in going_on(view) if outlook.next_look is not None
    ]
    if not ahead:
        return ()
    first = ahead[0][1]
    caption = line(f"Needed at look{NO_BREAK}{first.number}, if held at ", count(first.events), " events")
    heads = tuple(line(f"if {reading.experimental}") if view.masked else () for reading, _ in ahead)
    return (Table(caption, tuple(Column(head) for head in heads), _needed_rows([look for _, look in ahead])),)


def _needed_rows(looks: list[NextLook]) -> tuple[Row, ...]:
    def row(head: Line, spans: list[Span], *, indent: bool = False) -> Row:
        return Row(head, tuple(Cell((span,)) for span in spans), indent)

    return (
        row(line(Z), [or_dash(look.efficacy_z, 3) for look in looks]),
        row(
            line("as a hazard ratio"), [or_dash(look.efficacy_hazard_ratio, 3) for look in looks], indent=True
        ),
        row(
            line("Ratio, new events alone"),
            [or_dash(look.new_events_hazard_ratio, 3) for look in looks],
        ),
        row(line("Chance in percent, plan"), [percent(look.chance_design) for look in looks]),
        row(line("trend"), [percent(look.chance_trend) for look in looks], indent=True),
    )


def _predictive_table(view: ClosedView) -> tuple[Table, ...]:
    outlooks = going_on(view)
    if not outlooks:
        return ()
    powers = [outlook.predictive_power for _, outlook in outlooks]
    rows = [Row(line("Flat prior"), tuple(Cell((percent(power.flat),)) for power in powers))]
    priors = [power.prior for power in powers if power.prior is not None]
    if priors:
        rows.append(Row(line("The plan’s prior"), tuple(Cell((percent(prior),)) for prior in priors)))
    heads = [line(f"if {reading.experimental}") if view.masked else () for reading, _ in outlooks]
    return (
        Table(
            line("Predictive power at the final look, percent"),
            tuple(Column(head) for head in heads),
            tuple(rows),
        ),
    )


def _stopping_tables(view: ClosedView) -> tuple[Table, ...]:
    """As if stopped here, where a bound is crossed or the look is final; the naive estimate beside."""
    return tuple(
        _stopping_table(view, reading, reading.onwards.stopping)
        for reading in view.readings
        if (view.look.final or reading.verdict.crossed != "none")
        and not isinstance(reading.onwards.stopping, Absent)
    )


def _stopping_table(view: ClosedView, reading: Reading, ended: Stopping) -> Table:
    of = f", if {reading.experimental} is experimental" if view.masked else ""
    rows = [
        Row(line(P, ", one-sided"), (Cell(p_values(ended.p_one_sided)),)),
        Row(
            line("Median-unbiased ratio"),
            (Cell((number(ended.median_unbiased_hazard_ratio, 3),)),),
        ),
        Row(line(f"{level_text(ended.level)} interval"), (Cell(interval(ended.ci_low, ended.ci_high, 3)),)),
    ]
    if not view.masked:
        rows.append(_naive_row(view))
    return Table(line(f"As if stopped here{of}"), (Column(()),), tuple(rows))


def _naive_row(view: ClosedView) -> Row:
    cox = view.cox
    if isinstance(cox, Absent):
        return Row(line("Not adjusted"), (Cell((number(cox, 3),)),))
    limits = interval(cox.ci_low, cox.ci_high, 3)
    return Row(
        line(f"Not adjusted, {level_text(cox_level(view))}"),
        (Cell(line(number(cox.hazard_ratio, 3)), limits),),
    )


def _notes(view: ClosedView) -> tuple[Line, ...]:
    ratios = (
        " In each reading a hazard ratio is of the one taken as experimental to the other."
        if view.masked
        else ""
    )
    criterion = next((outlook.criterion for _, outlook in going_on(view)), None)
    if criterion is None:
        return ()
    trend = "Conditional power under an early trend is wild: its limits stand below it."
    against = line("Judged against this trial’s own last bound, ", Z, NO_BREAK, number(criterion, 3), ". ")
    return (line(against, trend, ratios),)
