"""How numbers, dates and arms are said. The rounding rules are DESIGN's "Display"."""

from __future__ import annotations

import math
from collections.abc import Sequence
from datetime import date, datetime

from app.model.values import Absent, Estimate
from app.sheets.blocks import ArmLabel, Letter, Line, Span, Tone

MINUS = "\u2212"
NO_BREAK = "\u00a0"
NO_BREAK_HYPHEN = "\u2011"
NOT_REACHED = "not reached"
NOT_ESTIMABLE = "not estimable"
DESCRIPTIVE = "descriptive, not adjusted for looks"
DAYS_PER_MONTH = 30.4375
FEWEST_Z_PLACES = 3
MOST_Z_PLACES = 17  # any two doubles near a bound differ by then
LONGEST_P = 8
LONGEST_ALPHA = 10

Part = str | Span | Line


def line(*parts: Part) -> Line:
    """Spans joined into one line; plain strings become plain spans."""
    spans: list[Span] = []
    for part in parts:
        if isinstance(part, str):
            spans.append(Span(part))
        elif isinstance(part, Span):
            spans.append(part)
        else:
            spans.extend(part)
    return tuple(span for span in spans if span.text)


def symbol(text: str) -> Span:
    return Span(text, "symbol")


Z = symbol("z")
P = symbol("p")
CROSSED = Span("crossed", "crossed")
DASH = Span("–", "quiet")


def decimal(value: float, places: int) -> str:
    """Fixed decimals with a true minus; a value that rounds to zero carries no sign."""
    text = f"{value:.{places}f}"
    if text.startswith("-"):
        text = text[1:] if float(text) == 0 else MINUS + text[1:]
    return text


def number(value: Estimate, places: int, *, tone: Tone = "plain") -> Span:
    """A number of the record at its display precision, or the word for why there is none."""
    if isinstance(value, Absent):
        return Span(NOT_REACHED if value.reason.startswith(NOT_REACHED) else NOT_ESTIMABLE, "quiet")
    return Span(decimal(value, places), tone, value=float(value))


def or_dash(value: Estimate, places: int) -> Span:
    """A bound, or a dash where there is no such bound."""
    return DASH if isinstance(value, Absent) else number(value, places)


def count(value: int, *, tone: Tone = "plain") -> Span:
    """A count; thousands are kept together without a mark up to 9999, spaced beyond."""
    text = f"{value:,}".replace(",", NO_BREAK) if value >= 10_000 else str(value)
    return Span(text, tone, value=float(value))


def counted(value: int, singular: str, plural: str | None = None) -> Line:
    """A count and its noun: "1 event", "384 events"."""
    noun = singular if value == 1 else (plural or singular + "s")
    return (count(value), Span(NO_BREAK + noun))


def of_total(part: int, whole: int) -> Line:
    """A count beside its denominator."""
    return (count(part), Span(" of "), count(whole))


def percent(fraction: Estimate, places: int = 1) -> Span:
    """A 0-1 quantity in percent, without the sign (the column or sentence names the unit)."""
    if isinstance(fraction, Absent):
        return number(fraction, places)
    return Span(decimal(100 * fraction, places), value=float(fraction))


def z_number(value: Estimate, *, tone: Tone = "plain", places: int = 3) -> Span:
    return number(value, places, tone=tone)


def turned(bound: float, places: int) -> Span:
    """The lower bound of a symmetric region: the recorded bound with its sign turned."""
    return Span(MINUS + decimal(bound, places), value=bound)


def z_places(z: Estimate, bound: Estimate) -> int:
    """Three places, or as many as it takes for a z and its bound to read differently when they differ.

    Sizes are compared, since a bound stands on either side where the test has two or the arms are masked.
    """
    if isinstance(z, Absent) or isinstance(bound, Absent) or abs(z) == abs(bound):
        return FEWEST_Z_PLACES
    places = FEWEST_Z_PLACES
    while places < MOST_Z_PLACES and decimal(abs(z), places) == decimal(abs(bound), places):
        places += 1
    return places


def places_for(value: float, significant: int) -> int:
    """Decimal places that show `value` with so many significant digits, once it is rounded to them."""
    if value <= 0:
        return significant
    exponent = int(f"{value:.{significant - 1}e}".partition("e")[2])
    return max(0, significant - 1 - exponent)


def p_values(*values: Estimate) -> tuple[Span, ...]:
    """p-values beside each other: two significant digits of the smallest, one precision for all."""
    known = [value for value in values if not isinstance(value, Absent) and value > 0]
    places = max((places_for(value, 2) for value in known), default=4)
    return tuple(_p_value(value, max(2, places)) for value in values)


def _p_value(value: Estimate, places: int) -> Span:
    if isinstance(value, Absent):
        return number(value, 4)
    if value < 10**-LONGEST_P:
        return Span(f"<{NO_BREAK}0.{'0' * (LONGEST_P - 1)}1", value=value)
    return Span(decimal(value, min(places, LONGEST_P)), value=value)


def alpha(value: float) -> Span:
    """Alpha with three significant digits, in powers of ten only where ten decimals will not do."""
    if value == 0:
        return Span("0", value=0.0)
    places = places_for(value, 3)
    if places > LONGEST_ALPHA:
        digits, _, exponent = f"{value:.2e}".partition("e")
        return Span(f"{digits}e{MINUS}{-int(exponent)}", value=value)
    return Span(decimal(value, places), value=value)


def alpha_difference(value: float) -> Span:
    """One alpha less another, with its sign."""
    size = alpha(abs(value))
    return Span(f"{MINUS if value < 0 else ''}{size.text}", value=value)


def level_text(level: float) -> str:
    """ "95%", "97.5%": a confidence level as the plan writes it."""
    return f"{100 * level:.10g}%"


def interval(low: Estimate, high: Estimate, places: int, *, scale: float = 1.0) -> Line:
    """ "0.658 to 0.983"; an open end is said in words, once where neither end exists."""
    return from_to(_scaled(low, places, scale), _scaled(high, places, scale))


def from_to(low: Span, high: Span) -> Line:
    """Two limits; once where both are the same word."""
    return (low,) if low == high and low.value is None else line(low, " to ", high)


def _scaled(value: Estimate, places: int, scale: float) -> Span:
    if isinstance(value, Absent) or math.isnan(value):
        reason = value.reason if isinstance(value, Absent) else NOT_ESTIMABLE
        return number(Absent(reason), places)
    return Span(decimal(scale * value, places), value=float(value))


def day_text(day: date) -> str:
    """ "8 Jan 2027", unbroken."""
    return f"{day.day}{NO_BREAK}{day:%b}{NO_BREAK}{day:%Y}"


def moment(at: str) -> str:
    """ "26 Jan 2027, 09:30 UTC" from the time of an entry."""
    return moment_text(datetime.fromisoformat(at))


def moment_text(moment: datetime) -> str:
    """ "8 Jan 2027, 14:05 UTC", unbroken."""
    return f"{day_text(moment.date())},{NO_BREAK}{moment:%H:%M}{NO_BREAK}UTC"


def listed(words: Sequence[str]) -> str:
    """ "A", "A and B", "A, B and C"."""
    return words[0] if len(words) == 1 else ", ".join(words[:-1]) + " and " + words[-1] if words else ""


def spoken(value: str) -> str:
    """An arm's value in a sentence: a word that is all capitals is not shouted."""
    return value.lower() if value.isupper() and value.isalpha() and len(value) > 3 else value


def arm_label(letter: Letter, value: str, *, masked: bool) -> ArmLabel:
    """ "Arm A" while masked; "Tablet (B)" once unmasked, so that both can lie side by side."""
    if masked:
        return ArmLabel(letter, f"Arm{NO_BREAK}{letter}", f"arm{NO_BREAK}{letter}")
    said = spoken(value)
    return ArmLabel(letter, f"{said[:1].upper()}{said[1:]}{NO_BREAK}({letter})", said)
