"""Makes a drawn SVG fit to stand inside a page, beside others.

Nothing in it reaches out of the page, its ids are its own, its colours are the page's, and it
holds no figure that cannot be seen.
"""

from __future__ import annotations

import re
from xml.etree import ElementTree as ET

INK, SOFT, ACCENT = "#010203", "#040506", "#070809"
"""Colours to draw with: each stands for one of the page's."""

_THEME = {INK: "currentColor", SOFT: "var(--soft, gray)", ACCENT: "var(--accent, currentColor)"}
_FONTS = re.compile(r"font-family:[^;]*")
_LONG_NUMBER = re.compile(r"-?\d+\.\d{2,}")
_REFERENCE = re.compile(r"url\(#([^)]+)\)")
_UNSEEN = {"metadata", "style"}
_ROUNDED = ("d", "x", "y", "width", "height", "transform")


def fit_svg(drawn: str, *, prefix: str, title: str) -> str:
    """Return an SVG element for a page.

    Args:
        drawn: An SVG document drawn in the colours of this module.
        prefix: Put before every id, so that no two pictures share one.
        title: What the picture shows, read out where it is not seen.
    """
    root = ET.fromstring(drawn)
    _drop_unseen(root)
    used = {name for element in root.iter() for name in _references(element)}
    for element in root.iter():
        _localise(element, used, prefix)
        _recolour(element)
        _round(element)
    _describe(root, prefix, title)
    return ET.tostring(root, encoding="unicode")


def _local(name: str) -> str:
    return name.rpartition("}")[2]


def _drop_unseen(root: ET.Element) -> None:
    for parent in list(root.iter()):
        for child in list(parent):
            if _local(child.tag) in _UNSEEN:
                parent.remove(child)


def _references(element: ET.Element) -> list[str]:
    found = [name for value in element.attrib.values() for name in _REFERENCE.findall(value)]
    links = [value for name, value in element.attrib.items() if _local(name) == "href"]
    return [*found, *(link.removeprefix("#") for link in links)]


def _localise(element: ET.Element, used: set[str], prefix: str) -> None:
    """Free an element of namespaces; prefix ids that are used and drop the others."""
    element.tag = _local(element.tag)
    element.text, element.tail = _squeezed(element.text), _squeezed(element.tail)
    given = dict(element.attrib)
    element.attrib.clear()
    for name, value in given.items():
        local = _local(name)
        if local == "id" and value in used:
            element.attrib[local] = prefix + value
        elif local == "href":
            element.attrib[local] = f"#{prefix}{value.removeprefix('#')}"
        elif local != "id":
            element.attrib[local] = _REFERENCE.sub(rf"url(#{prefix}\1)", value)


def _squeezed(text: str | None) -> str | None:
    return text if text and text.strip() else None


def _recolour(element: ET.Element) -> None:
    style = element.attrib.get("style")
    if style is None:
        return
    for sentinel, colour in _THEME.items():
        style = style.replace(sentinel, colour)
    element.attrib["style"] = _FONTS.sub("font-family: var(--sans, sans-serif)", style)


def _round(element: ET.Element) -> None:
    for name in _ROUNDED:
        value = element.attrib.get(name)
        if value is not None:
            short = _LONG_NUMBER.sub(lambda match: f"{float(match[0]):.2f}", value)
            element.attrib[name] = " ".join(short.split())


def _describe(root: ET.Element, prefix: str, title: str) -> None:
    """Name the picture and let its width follow the page."""
    for name in ("width", "height", "version"):
        root.attrib.pop(name, None)
    named = ET.Element("title", {"id": f"{prefix}title"})
    named.text = title
    root.insert(0, named)
    root.attrib.update({"role": "img", "class": "picture", "aria-labelledby": f"{prefix}title"})
