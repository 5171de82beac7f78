"""The libraries' tests run in an environment of their own (tests/peers.lock), which `python3 tests` makes."""

from __future__ import annotations

from importlib.util import find_spec

collect_ignore = [] if find_spec("lifelines") else ["libraries"]
