"""One entry per quantity: how it is computed, by which convention, from which publication.

In `text` a symbol stands between asterisks (`*z*`); the sheets set it in italics.
Citations are from memory unless DEVELOPERS.md says otherwise; the numbers are checked in app/validation.
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Method:
    """`term` heads the entry on a page; `text` states formula and convention; `source` the publication."""

    term: str
    text: str
    source: str


METHODS: dict[str, Method] = {
    "kaplan-meier": Method(
        "Curves",
        "Kaplan-Meier product-limit estimate, *S*(*t*) = ∏(1 − *d*/*n*); "
        "at one time events precede censorings.",
        "Kaplan and Meier (1958), JASA 53, 457–481.",
    ),
    "greenwood": Method(
        "Interval",
        "Greenwood’s variance; pointwise limits on the log(−log *S*) scale.",
        "Greenwood (1926); Kalbfleisch and Prentice (1980).",
    ),
    "median": Method(
        "Median",
        "The first time the curve is at 50% or below (midpoint where it is flat at exactly 50%); limits by "
        "inverting the pointwise limits.",
        "Brookmeyer and Crowley (1982), Biometrics 38, 29–41.",
    ),
    "follow-up": Method(
        "Follow-up",
        "Median of the reverse Kaplan-Meier curve: censorings are its events, events its censorings.",
        "Schemper and Smith (1996), Controlled Clinical Trials 17, 343–346.",
    ),
    "logrank": Method(
        "Statistic",
        "Log-rank: *U* = *O* − *E* and hypergeometric variance *V* of the experimental arm, each summed over "
        "strata; *z* = *s*(*E* − *O*)/√*V* with *s* = 1 for a bad event and −1 for a good one.",
        "Mantel (1966), Cancer Chemotherapy Reports 50, 163–170; "
        "Mantel and Haenszel (1959), JNCI 22, 719–748.",
    ),
    "cox": Method(
        "Hazard ratio",
        "Cox’s partial likelihood, stratified as the test is, ties by Efron’s method; "
        "the interval is Wald’s on the log scale and is not adjusted for looks.",
        "Cox (1972), JRSS B 34, 187–220; Efron (1977), JASA 72, 557–565.",
    ),
    "information": Method(
        "Information",
        "Fraction *t* = events / planned events. Subjects are counted in the arm they were randomised to.",
        "Lan and Zucker (1993), Statistics in Medicine 12, 753–765.",
    ),
    "variance-ratio": Method(
        "Variance ratio",
        "*V*/(*d* *p* *q*): the log-rank variance over events times the planned shares of the arms. "
        "Well below 1, events overstate the information.",
        "Schoenfeld (1981), Biometrika 68, 316–319.",
    ),
    "o'brien-fleming-type": Method(
        "Spending",
        "O’Brien-Fleming-type: with *a* the one-sided level, *f*(*t*) = 2 − 2Φ(*z*(1 − *a*/2)/√*t*).",
        "Lan and DeMets (1983), Biometrika 70, 659–663.",
    ),
    "pocock-type": Method(
        "Spending",
        "Pocock-type: with *a* the one-sided level, *f*(*t*) = *a* log(1 + (e − 1)*t*).",
        "Lan and DeMets (1983), Biometrika 70, 659–663.",
    ),
    "boundary": Method(
        "Boundary",
        "Solved so that the chance of a first crossing here, under no effect, is the alpha spent here; "
        "correlations √(*I*₁/*I*₂) use the information recorded at each look. Earlier bounds stand as used.",
        "Armitage, McPherson and Rowe (1969), JRSS A 132, 235–244.",
    ),
    "bound-hazard-ratio": Method(
        "As a hazard ratio",
        "exp(−*s* *z*/√*I*) with *I* = *V* at a look held and *d* *p* *q* at a planned one.",
        "Schoenfeld (1981), Biometrika 68, 316–319.",
    ),
    "changes": Method(
        "Changes",
        "This extract is compared with the last one subject by subject. An event is new, reversed "
        "(counted before, not now) or moved (counted in both, at another time).",
        "Common practice.",
    ),
    "person-time": Method(
        "Person-time",
        "The sum of the subjects’ times to event or censoring; days are shown as years of 365.25 days.",
        "Common practice.",
    ),
    "chain": Method(
        "Chain",
        "Each entry holds the SHA-256 of its canonical JSON and of the entry before it. The head witnesses "
        "all entries up to it; a whole file rewritten by its holder is found only against a head kept "
        "elsewhere.",
        "RFC 8785 (canonical JSON); FIPS 180-4 (SHA-256).",
    ),
}
