"""Files that a person takes away."""

from __future__ import annotations

import io
import re
import zipfile
from collections.abc import Sequence
from urllib.parse import quote

from starlette.responses import Response

from app.sheets.blocks import PageFrame


def tables_stem(frame: PageFrame) -> str:
    """A file that leaves the page says what the page says on top: trial, look, side, arms, cutoff."""
    parts = (
        frame.trial_name,
        f"look-{frame.look}",
        frame.side,
        frame.disclosure,
        "cutoff",
        frame.dates[0].iso,
    )
    return "-".join(re.sub(r"[^A-Za-z0-9-]+", "-", part) for part in parts if part)


def archive(files: Sequence[tuple[str, bytes]]) -> bytes:
    """The files zipped; the same tables give the same bytes."""
    written = io.BytesIO()
    with zipfile.ZipFile(written, "w") as zipped:
        for name, content in files:
            zipped.writestr(zipfile.ZipInfo(name), content, zipfile.ZIP_DEFLATED)
    return written.getvalue()


def attachment(content: bytes, name: str, media_type: str) -> Response:
    """A file to keep, not to show; should a browser show it after all, the sandbox keeps it powerless."""
    headers = {
        "Content-Disposition": f"attachment; filename*=UTF-8''{quote(name)}",
        "Content-Security-Policy": "sandbox",
    }
    return Response(content, media_type=media_type, headers=headers)
