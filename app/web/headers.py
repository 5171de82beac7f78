"""The headers of every answer, whoever made it: pages, errors, files, and what no route ever saw."""

from __future__ import annotations

from starlette.datastructures import MutableHeaders
from starlette.types import ASGIApp, Message, Receive, Scope, Send

CONTENT_SECURITY_POLICY = "; ".join(
    (
        "default-src 'none'",
        "script-src 'self'",
        "style-src 'self'",
        "img-src 'self' blob:",  # blob: is how a figure is saved as a picture
        "font-src 'self'",
        "connect-src 'self'",
        "base-uri 'none'",
        "form-action 'self'",
        "frame-ancestors 'none'",
    )
)

STRICT = {
    "Content-Security-Policy": CONTENT_SECURITY_POLICY,
    "Cross-Origin-Opener-Policy": "same-origin",
    "Cross-Origin-Resource-Policy": "same-origin",
    "X-Content-Type-Options": "nosniff",
    # not no-referrer: form posts would then carry `Origin: null`, which the gate refuses
    "Referrer-Policy": "same-origin",
    "Permissions-Policy": "camera=(), geolocation=(), microphone=(), payment=(), usb=()",
}

NOT_KEPT = "no-store"
KEPT_SHORTLY = "private, max-age=300"  # the program's own files, which hold nothing of a trial


class StrictHeaders:
    """Wraps the finished application, so that answers made outside its routes carry the headers too."""

    def __init__(self, app: ASGIApp) -> None:
        self.app = app

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        if scope["type"] != "http":
            await self.app(scope, receive, send)
            return

        async def send_with_headers(message: Message) -> None:
            if message["type"] == "http.response.start":
                add_headers(MutableHeaders(scope=message), scope["path"], message["status"])
            await send(message)

        await self.app(scope, receive, send_with_headers)


def add_headers(headers: MutableHeaders, path: str, status: int) -> None:
    """Only a stricter Content-Security-Policy of the answer's own is left as it is."""
    for name, value in STRICT.items():
        if name == "Content-Security-Policy" and headers.get(name) == "sandbox":
            continue
        headers[name] = value
    is_own_file = path.startswith("/static/") and status in (200, 304)
    headers["Cache-Control"] = KEPT_SHORTLY if is_own_file else NOT_KEPT
