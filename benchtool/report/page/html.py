"""The page as one HTML file that fetches nothing."""

from __future__ import annotations

import re
from functools import lru_cache
from typing import TYPE_CHECKING

from benchtool.report.page.geometry import place_marks
from benchtool.report.page.pictures import draw_pictures
from benchtool.report.page.sheetfit import print_size_pt
from benchtool.report.page.views import Page, Pictures
from benchtool.report.text import printable

if TYPE_CHECKING:
    from jinja2 import Environment
    from markupsafe import Markup

_FIGURE = re.compile(r"(?<=\d) (?=(?:[pnµmkMG]?(?:s|V|Ω|F|A|Hz)|ppm|%|°C)(?!\w))|(?<=±) (?=\d)")
_MOST_DRAWN = 12
"""Sheets with pictures: each costs some 50 KiB and a quarter of a second."""


def write_page(page: Page) -> str:
    """Return the page as HTML.

    Args:
        page: What it shows; any text in it may come from a hostile file.
    """
    template = _environment().get_template("page.html")
    return template.render(page=page, print_size_pt=print_size_pt(page))


@lru_cache(maxsize=1)
def _environment() -> Environment:
    from jinja2 import Environment, PackageLoader, StrictUndefined

    environment = Environment(
        loader=PackageLoader("benchtool.report.page", "templates"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        finalize=_harmless,
    )
    environment.filters["tied"] = _tied
    environment.globals.update(place_marks=place_marks, pictures_of=_pictures)
    return environment


def _harmless(value: object) -> object:
    """Write out control characters of every text that is not already HTML."""
    if isinstance(value, str) and not hasattr(value, "__html__"):
        return printable(value)
    return value


def _tied(text: str) -> str:
    """Keep figures and their units on one line."""
    return _FIGURE.sub("\N{NO-BREAK SPACE}", text)


def _pictures(block: Pictures, number: int) -> list[tuple[str, str, Markup]]:
    """Return name, caption and SVG of each picture of the sheet of this number."""
    from markupsafe import Markup

    if number > _MOST_DRAWN:
        return []
    drawn = draw_pictures(block.result, prefix=f"s{number}-")
    return [(item.name, item.caption, Markup(item.svg)) for item in drawn]
