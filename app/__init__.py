"""Lookledger: interim looks at a running randomised trial, recomputed, shown and frozen."""

__version__ = "0.1.0"
