"""Where templates, static files and demo data are: in an installed package, or beside it in a checkout."""

from __future__ import annotations

from pathlib import Path

PACKAGE = Path(__file__).resolve().parent
PLACES = (PACKAGE / "_assets", PACKAGE.parent)


def asset(*parts: str) -> Path:
    """The shipped file or folder, as in asset("templates", "page.html")."""
    for place in PLACES:
        path = place.joinpath(*parts)
        if path.exists():
            return path
    raise FileNotFoundError(f"{'/'.join(parts)} is not shipped; looked in {PLACES[0]} and {PLACES[1]}")
