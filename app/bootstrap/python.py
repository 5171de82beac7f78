"""The one question that must be asked before newer syntax is read, so this file is written for Python 3.6."""

import sys

OLDEST = (3, 11)
SETUP_ERROR = 5


def require_supported_python() -> None:
    """End with one sentence where this Python is older than the program can run on."""
    if sys.version_info[:2] >= OLDEST:
        return
    sys.stderr.write(
        "This Python is too old. Found Python " + sys.version.split()[0] + " at " + sys.executable + ". "
        "Accepted: Python 3.11 or newer. Install a newer Python and start with it, as in: python3.12 app.\n"
    )
    sys.exit(SETUP_ERROR)
