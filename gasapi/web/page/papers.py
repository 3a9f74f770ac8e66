"""Templates into HTML: the sheet and the papers beside it."""

from __future__ import annotations

from typing import Any

from jinja2 import Environment, PackageLoader, StrictUndefined

from gasapi import __version__
from gasapi.units import QUANTITIES, REFERENCE_CONDITIONS
from gasapi.web.page.assets import Assets
from gasapi.web.page.interface import calls_of, schemas_of

__all__ = ["Papers"]

_UNIT_ORDER = {
    "pressure": ("barg", "bar", "kPag", "kPa", "MPa", "psig", "psia", "mbar", "Pa"),
    "temperature": ("degC", "K", "degF", "degR"),
}


class Papers:
    """What can be read in a browser, as bytes of UTF-8.

    :param assets: the files that the papers refer to
    """

    def __init__(self, assets: Assets) -> None:
        self._templates = Environment(
            loader=PackageLoader(__package__),
            autoescape=True,
            undefined=StrictUndefined,
            trim_blocks=True,
            lstrip_blocks=True,
        )
        self._templates.globals.update(
            assets=f"assets/{assets.digest}",
            modules=assets.modules,
            version=__version__,
            unit_sign=_unit_sign,
            quantity_words=lambda name: name.replace("_", " "),
            number=lambda value: f"{value:.6g}",
        )

    def sheet(self, models: list[dict[str, Any]]) -> bytes:
        """Return the page itself.

        :param models: the equations of state as the service lists them
        """
        return self._render("sheet.html", models=models, units=_units(), reference_conditions=REFERENCE_CONDITIONS)

    def catalogue(self, search: str, gases: list[dict[str, Any]], models: list[dict[str, Any]]) -> bytes:
        """Return the list of gases and equations."""
        return self._render("catalogue.html", search=search, gases=gases, models=models)

    def gas(self, gas: dict[str, Any]) -> bytes:
        """Return what is known of one gas."""
        constants = {name: value for name, value in gas.items() if isinstance(value, dict) and "source" in value}
        return self._render("gas.html", gas=gas, constants=constants)

    def interface(self, document: dict[str, Any]) -> bytes:
        """Return the reference of the interface.

        :param document: the OpenAPI document
        """
        return self._render("interface.html", calls=calls_of(document), schemas=schemas_of(document))

    def _render(self, template: str, **values: Any) -> bytes:
        return self._templates.get_template(template).render(**values).encode()


def _units() -> dict[str, list[Any]]:
    """Return the units of each quantity, those that plants use most first."""
    ordered = {}
    for quantity, units in QUANTITIES.items():
        first = [name for name in _UNIT_ORDER.get(quantity, ()) if name in units]
        ordered[quantity] = [units[name] for name in (*first, *(name for name in units if name not in first))]
    return ordered


def _unit_sign(name: str) -> str:
    """Return a unit as people write it; the interface takes the plain name."""
    sign = {"degC": "°C", "degF": "°F", "degR": "°R"}.get(name, name)
    return sign.replace("m3", "m³").replace("ft3", "ft³").replace("in3", "in³").replace("cm2", "cm²").replace("ft2", "ft²")
