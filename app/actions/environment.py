"""What computed a frozen look: written into the freeze entry and environment.json, never into the report."""

from __future__ import annotations

import platform

import numpy
import scipy

from app import __version__


def environment() -> dict[str, str]:
    """What last bits can depend on: versions, and the vector instructions used on this processor."""
    return {
        "program": __version__,
        "python": platform.python_version(),
        "numpy": numpy.__version__,
        "scipy": scipy.__version__,
        "machine": platform.machine(),
        "vector_instructions": " ".join(_vector_instructions()),
        "system": platform.system(),
    }


def _vector_instructions() -> list[str]:
    known = numpy.show_config(mode="dicts")["SIMD Extensions"]
    return [*known["baseline"], *known["found"]]
