"""The caution: on every page and every report, and nobody can turn it off."""

LEAD = "Advisory."
CAUTION = (
    "A boundary is a guideline, not a rule; advising a stop for benefit without a crossing gives up the "
    "plan’s error control. The recommendation belongs to the data monitoring committee under its "
    "charter; the protocol, local regulation and licensed clinical and statistical practice come first."
)
