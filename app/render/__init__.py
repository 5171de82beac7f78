"""Sheet -> page, report, SVG figure, Plotly JSON, CSV. Draws what a Sheet says and decides no word of it."""
