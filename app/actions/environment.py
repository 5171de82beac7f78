"""What computed a frozen look: written into the freeze entry and environment.json, never into the report."""

from __future__ import annotations

import platform

import numpy
import scipy

from app import __version__


def environment() -> dict[str, str]:
    return {
        "program": __version__,
        "python": platform.python_version(),
        "numpy": numpy.__version__,
        "scipy": scipy.__version__,
        "machine": platform.machine(),
        "system": platform.system(),
    }
