"""A small builder of SVG: elements in, escaped text with the same bytes every time out."""

from __future__ import annotations

import re
from dataclasses import dataclass
from html import escape

NAMESPACE = "http://www.w3.org/2000/svg"
# XML 1.0 has no way to write these at all, not even as a reference
UNWRITABLE = re.compile("[^\t\n\r\u0020-\ud7ff\ue000-\ufffd\U00010000-\U0010ffff]")

Attribute = str | float | None


@dataclass(frozen=True)
class Element:
    """One element; str() is its markup."""

    name: str
    attributes: tuple[tuple[str, str], ...] = ()
    children: tuple[Element | str, ...] = ()

    def __str__(self) -> str:
        opening = "".join(f' {name}="{escaped(value)}"' for name, value in self.attributes)
        if not self.children:
            return f"<{self.name}{opening}/>"
        inside = "".join(str(c) if isinstance(c, Element) else escaped(c) for c in self.children)
        return f"<{self.name}{opening}>{inside}</{self.name}>"


def element(name: str, *children: Element | str, **attributes: Attribute) -> Element:
    """`element("line", x1=0, stroke_width=1.5)`; an attribute that is None is left out."""
    written = tuple(
        (
            attribute.rstrip("_").replace("_", "-") if attribute != "viewBox" else attribute,
            written_value(value),
        )
        for attribute, value in attributes.items()
        if value is not None
    )
    return Element(name, written, children)


def written_value(value: str | float) -> str:
    return value if isinstance(value, str) else coordinate(value)


def coordinate(value: float) -> str:
    """At most two decimals, never an exponent, never a negative zero."""
    text = f"{value:.2f}".rstrip("0").rstrip(".")
    return "0" if text == "-0" else text


def escaped(text: str) -> str:
    return escape(UNWRITABLE.sub("\ufffd", text), quote=True)
