"""Figures as SVG text: one module a figure, each drawn for a wide and for a narrow page."""
