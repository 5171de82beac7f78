"""Lookledger: interim looks at a running randomised trial, recomputed, shown and frozen."""

import os

# One thread: sums depend on how many there are, and small ones are faster so. Said before numpy is imported.
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

__version__ = "0.2.0"
