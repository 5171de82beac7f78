"""One entry per quantity: how it is computed, by which convention, from which publication.

In `text` a symbol stands between asterisks (`*z*`); the sheets set it in italics.
Citations are from memory unless DEVELOPERS.md says otherwise; the numbers are checked in app/validation.
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Method:
    """`term` heads the entry on a page; `text` states formula and convention; `source` the publication.

    `masked` is the text where arms are letters, for an entry that names them by their part.
    """

    term: str
    text: str
    source: str
    masked: str = ""


METHODS: dict[str, Method] = {
    "kaplan-meier": Method(
        "Curves",
        "Kaplan-Meier product-limit estimate, *S*(*t*) = ∏(1 − *d*/*n*); "
        "at one time events precede censorings.",
        "Kaplan and Meier (1958), JASA 53, 457–481.",
    ),
    "greenwood": Method(
        "Interval",
        "Greenwood’s variance; pointwise limits on the scale named under the figure, log(−log *S*) unless "
        "the plan names another.",
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
        masked="Log-rank: *U* = *O* − *E* and hypergeometric variance *V* of arm A, each summed over strata; "
        "*z* = *s*(*E* − *O*)/√*V* with *s* = 1 for a bad event and −1 for a good one, if A is "
        "experimental; if B is, *z* with the other sign.",
    ),
    "cox": Method(
        "Hazard ratio",
        "Cox’s partial likelihood, stratified as the test is, ties by Efron’s method unless the plan "
        "names another; "
        "the interval is Wald’s on the log scale and is not adjusted for looks.",
        "Cox (1972), JRSS B 34, 187–220; Efron (1977), JASA 72, 557–565.",
    ),
    "landmark": Method(
        "Landmarks",
        "The curves at times fixed in the plan; the interval of their difference adds Greenwood’s variances.",
        "Klein, Logan, Harhoff and Andersen (2007), Statistics in Medicine 26, 4505–4519.",
    ),
    "log-log": Method(
        "log(−log)",
        "log(−log *S*) of each Kaplan-Meier curve against time on a log scale, at the times with an event: "
        "parallel when hazards are proportional. Early steps rest on few events.",
        "Kay (1977), Applied Statistics 26, 227–237.",
    ),
    "residuals": Method(
        "Residuals",
        "Scaled Schoenfeld residuals *b* + *d* *V* *r*: at each event an estimate of the log hazard ratio. "
        "The smooth is a natural cubic spline with 4 coefficients over 1\u00a0−\u00a0*S*(*t*−), drawn "
        "against time; its pointwise band takes *d* *V* for the variance of a residual. It describes and "
        "tests nothing.",
        "Grambsch and Therneau (1994), Biometrika 81, 515–526; Schoenfeld (1982), Biometrika 69, 239–241.",
    ),
    "proportionality": Method(
        "Proportional hazards",
        "Score test for a log hazard ratio that changes along 1 − *S*(*t*−), *S* the Kaplan-Meier curve "
        "of both "
        "arms together, in the Cox model of the plan.",
        "Grambsch and Therneau (1994), Biometrika 81, 515–526.",
    ),
    "restricted-mean": Method(
        "Restricted mean",
        "Area under the Kaplan-Meier curve up to the time fixed in the plan; variance by the areas "
        "beyond each "
        "event. Not stratified.",
        "Irwin (1949), Journal of Hygiene 47, 188–189; Royston and Parmar (2011), Statistics in Medicine 30, "
        "2409–2421.",
    ),
    "weighted": Method(
        "Weighted tests",
        "Log-rank with weights *S*(*t*−)^*rho* (1 − *S*(*t*−))^*gamma*, *S* of both arms together, "
        "stratified as "
        "the test is; (0, 0) is the log-rank test, (0, 1) counts late differences more.",
        "Harrington and Fleming (1982), Biometrika 69, 553–566.",
    ),
    "weighted-maximum": Method(
        "Largest of them",
        "The *z* largest in absolute value; *p* from the joint normal distribution of all.",
        "Lee (1996), Biometrics 52, 721–725; critique: Freidlin and Korn (2019), JCO 37, 3455–3459.",
    ),
    "information": Method(
        "Information",
        "Fraction *t* = events / planned events. Subjects are counted in the arm they were randomised to.",
        "Lan and Zucker (1993), Statistics in Medicine 12, 753–765.",
    ),
    "information by variance": Method(
        "Information",
        "Fraction *t* = *V* / planned *V*, with *V* the log-rank variance. Subjects are counted in the arm "
        "they were randomised to. Further hypotheses: events / planned events.",
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
    "power": Method(
        "Spending",
        "Power: with *a* the one-sided level, *f*(*t*) = *a* *t* to the plan’s exponent.",
        "Kim and DeMets (1987), Biometrika 74, 149–154.",
    ),
    "hwang-shih-decani": Method(
        "Spending",
        "Hwang-Shih-DeCani: with *a* the one-sided level and *g* the plan’s parameter, *f*(*t*) = "
        "*a*(1 − exp(−*g* *t*))/(1 − exp(−*g*)).",
        "Hwang, Shih and DeCani (1990), Statistics in Medicine 9, 1439–1445.",
    ),
    "table": Method(
        "Spending",
        "Straight lines between the points of the plan, from nothing at the start.",
        "Lan and DeMets (1983), Biometrika 70, 659–663.",
    ),
    "o'brien-fleming": Method(
        "Boundary family",
        "O’Brien-Fleming: interim bounds *c*/√*t*, *c* from the plan’s looks; the last is solved for what "
        "is left.",
        "O’Brien and Fleming (1979), Biometrics 35, 549–556.",
    ),
    "pocock": Method(
        "Boundary family",
        "Pocock: one interim bound *c*, from the plan’s looks; the last is solved for what is left.",
        "Pocock (1977), Biometrika 64, 191–199.",
    ),
    "wang-tsiatis": Method(
        "Boundary family",
        "Wang-Tsiatis: interim bounds *c* times *t* to the plan’s shape less ½; the last is solved for "
        "what is left.",
        "Wang and Tsiatis (1987), Biometrics 43, 193–199.",
    ),
    "haybittle-peto": Method(
        "Boundary family",
        "Haybittle-Peto: the plan’s bound at every interim look; the last is solved for what is left.",
        "Haybittle (1971), British Journal of Radiology 44, 793–797.",
    ),
    "futility": Method(
        "Futility",
        "Spends the type II error under the effect that has the plan’s power, or goes by the plan’s rule; "
        "at the final look it is the efficacy bound. Efficacy ignores it unless it is binding.",
        "Pampallona, Tsiatis and Kim (2001), Drug Information Journal 35, 1113–1121.",
    ),
    "harm": Method(
        "Harm",
        "The mirror of a one-sided test at harm’s own alpha; efficacy ignores it. On an endpoint of its own "
        "it has that endpoint’s log-rank test and information and spends by the plan’s fraction; bounds "
        "ahead suppose that its events grow as those of the test do.",
        "DeMets and Ware (1982), Biometrika 69, 661–663.",
    ),
    "hypotheses": Method(
        "Further hypotheses",
        "Each has its own log-rank test and its own bounds, by its own alpha and events. One that waits is "
        "tested only from the look at which the one before it has crossed, or by its final look where that "
        "came before; what its bounds spend is not given back. Alphas side by side add up, along a chain the "
        "largest counts.",
        "Hung, Wang and O’Neill (2007), Journal of Biopharmaceutical Statistics 17, 1201–1210; Glimm, Maurer "
        "and Bretz (2010), Statistics in Medicine 29, 219–228; Tamhane, Mehta and Liu (2010), Biometrics 66, "
        "1174–1184.",
    ),
    "repeated-interval": Method(
        "Repeated interval",
        "exp(−*s*(*z* ± bound)/√*V*): it holds at every look, whatever is decided. Binding futility lowers "
        "the bounds, and then there is none.",
        "Jennison and Turnbull (1989), JRSS B 51, 305–361.",
    ),
    "conditional-power": Method(
        "Conditional power",
        "The chance of crossing efficacy later given *z* now: at the final look only, Φ((*z*√*t* + θ(1 − "
        "*t*) − *c*)/√(1 − *t*)); along all planned looks by recursive integration. θ is the mean of *z* "
        "at full information: −*s* log(ratio) √(*d* *p* *q*) of the planned events, *z*/√*t* of the trend.",
        "Lan, Simon and Halperin (1982), Communications in Statistics C 1, 207–219.",
    ),
    "predictive-power": Method(
        "Predictive power",
        "Conditional power at the final look averaged over the effects that the result so far and a prior "
        "allow.",
        "Spiegelhalter, Freedman and Blackburn (1986), Controlled Clinical Trials 7, 8–17.",
    ),
    "next-look": Method(
        "New events alone",
        "The hazard ratio that the events up to the next look must show by themselves for its bound to be "
        "met.",
        "Lan and Wittes (1988), Biometrics 44, 579–585.",
    ),
    "after-a-stop": Method(
        "As if stopped here",
        "Stagewise ordering: an earlier efficacy stop says more, and at one look the larger *z*. "
        "Non-binding futility and harm are left out, so the median is not exactly unbiased.",
        "Tsiatis, Rosner and Mehta (1984), Biometrics 40, 797–803.",
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
