"""The full verification that runs, or ran last: in its own thread, so that its page can say how far it is."""

from __future__ import annotations

from collections.abc import Sequence
from threading import Event, Lock, Thread

from app.actions.check import Progress, verify
from app.actions.desk import Desk
from app.errors import AppError
from app.verification.check import CheckReport


class Run:
    """One verification: how far it has come, and what came of it."""

    def __init__(self, heads: Sequence[str]) -> None:
        self.heads = tuple(heads)
        self.progress: Progress | None = None
        self.report: CheckReport | None = None
        self.error: AppError | None = None
        self.over = Event()

    def tell(self, progress: Progress) -> None:
        self.progress = progress


class Verifying:
    """At most one verification at a time; it reads the file through a connection of its own."""

    def __init__(self, desk: Desk) -> None:
        self._desk = desk
        self._lock = Lock()
        self.run: Run | None = None

    def begin(self, heads: Sequence[str] = ()) -> Run:
        """Begin a verification, unless one is under way that looks for the same heads."""
        with self._lock:
            if self.run is not None and not self.run.over.is_set():
                return self.run
            run = self.run = Run(heads)
            Thread(target=self._carry_out, args=(run,), daemon=True).start()
            return run

    def _carry_out(self, run: Run) -> None:
        try:
            run.report = verify(self._desk.settings, self._desk.path, heads=run.heads, tell=run.tell)
            if not run.report.ok:
                self._desk.trial.check_chain()  # what is damaged is not written to from here on
        except AppError as fault:
            run.error = fault
        finally:
            run.over.set()
