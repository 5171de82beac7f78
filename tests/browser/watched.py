"""A browser that is watched: what it says, asks for, violates, and what a screen reader would stumble on."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from typing import Any

from axe_playwright_python.sync_playwright import Axe
from playwright.sync_api import Browser, BrowserContext, Page

VIEWPORT = {"width": 1366, "height": 768}

NOTES_VIOLATIONS = """
addEventListener("securitypolicyviolation", (event) => {
  window.noteViolation(`${event.violatedDirective} ${event.blockedURI} at line ${event.lineNumber}`);
});
"""


@dataclass
class Watched:
    """One context of the browser with everything noticed in it."""

    context: BrowserContext
    own: str
    noticed: list[str] = field(default_factory=list)

    def page(self) -> Page:
        return self.context.new_page()

    def note_request(self, url: str) -> None:
        if not url.startswith((self.own, "blob:", "data:")):
            self.noticed.append(f"request to {url}")


@contextmanager
def watched(chromium: Browser, own: str, **options: Any) -> Iterator[Watched]:
    """A fresh context; requests to anywhere but `own`, console lines, faults and violations are noticed."""
    context = chromium.new_context(viewport=VIEWPORT, **options)
    context.set_default_timeout(15_000)
    seen = Watched(context, own)
    context.on("console", lambda line: seen.noticed.append(f"console {line.type}: {line.text}"))
    context.on("weberror", lambda fault: seen.noticed.append(f"error: {fault.error}"))
    context.on("request", lambda request: seen.note_request(request.url))
    context.expose_function("noteViolation", lambda told: seen.noticed.append(f"violation: {told}"))
    context.add_init_script(NOTES_VIOLATIONS)
    yield seen
    context.close()


def obstacles(page: Page) -> list[str]:
    """What axe finds wrong with a page."""
    violations = Axe().run(page).response["violations"]
    return [
        f"{page.url}: {violation['id']}, {violation['help']}: {[node['html'] for node in violation['nodes']]}"
        for violation in violations
    ]
