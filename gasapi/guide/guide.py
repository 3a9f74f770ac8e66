"""Pages into HTML, in the frame of the other papers."""

from __future__ import annotations

from collections.abc import Mapping
from importlib.resources import files
from typing import Final, NamedTuple

from jinja2 import ChoiceLoader, Environment, PackageLoader, StrictUndefined

from gasapi import __version__
from gasapi.web.page.assets import Assets

__all__ = ["PAGES", "Guide", "Page"]


class Page(NamedTuple):
    """A page of the guide: its name in the address, its title, and what it answers."""

    name: str
    title: str
    answers: str


PAGES: Final = (
    Page("flow", "Flow", "How much is 120 m3/h of gas at 40 bar, in every other measure, and what does the meter make of it?"),
    Page("vessel", "Vessel", "How much is in the cylinder, how much was used, and how long does it last?"),
    Page("pressure-decay", "Leak test", "Did the pressure fall because gas left, or because it cooled?"),
    Page("fraction-from-density", "Fraction from density", "How much hydrogen is in the casing, by a density meter?"),
    Page("molar-mass", "Molar mass", "What may be in the line or the cylinder, and what must be assumed of it?"),
    Page(
        "comparison", "Comparison of equations", "How wrong is the ideal gas here, and is the choice of equation the problem?"
    ),
    Page("phase-boundary", "Phase boundary", "Where does this gas begin to condense?"),
    Page("lookup-table", "Table for a controller", "How does a controller that cannot call a service get the density?"),
)
"""The pages in reading order."""


class Guide:
    """All pages, rendered once."""

    def __init__(self) -> None:
        assets = Assets()
        templates = Environment(
            loader=ChoiceLoader([PackageLoader("gasapi.guide", "pages"), PackageLoader("gasapi.web.page")]),
            autoescape=True,
            undefined=StrictUndefined,
            trim_blocks=True,
            lstrip_blocks=True,
        )
        templates.globals.update(assets=f"assets/{assets.digest}", modules=assets.modules, version=__version__)
        self.index = templates.get_template("index.html").render(pages=PAGES).encode()
        self.pages: Mapping[str, bytes] = {
            page.name: templates.get_template(f"{page.name}.html").render(page=page, pages=PAGES).encode() for page in PAGES
        }

    @staticmethod
    def source(name: str) -> str:
        """Return a page as it stands in its file."""
        return files("gasapi.guide").joinpath("pages", f"{name}.html").read_text(encoding="utf-8")
