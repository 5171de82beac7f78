"""Invented trials of patients, analysed by the program's own tests."""
