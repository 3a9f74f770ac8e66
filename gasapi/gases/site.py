"""The site file: gases, substances and ambient pressure of one plant, in a TOML file that is read once at the start.

    [site]
    ambient_pressure = 95000        # Pa; gauge readings are taken against it and then count as known, not assumed
    dew_point_margin = 5            # K

    [gases.fuel-gas]
    name = "Fuel gas of boiler house 2"
    fractions = { methane = 0.9, ethane = 0.06, nitrogen = 0.04 }
    basis = "mole"                  # or "mass"
    fraction_unit = "1"             # or "%" or "ppm"
    synonyms = ["FG"]

    [substances.my-solvent]
    molar_mass = 86.2               # g/mol
    critical_temperature = 507.6    # K
    critical_pressure = 3025000     # Pa
    acentric_factor = 0.301
    hazards = ["flammable"]

Whatever is wrong with it is a ``DataError`` that names the file, the key and what would be right; nothing is repaired in
silence, because a typing error in a plant's own gas would otherwise be wrong in every answer.
"""

from __future__ import annotations

import hashlib
import math
import re
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

from gasapi.errors import UnknownGas
from gasapi.gases.catalogue import AmbiguousName, Catalogue
from gasapi.gases.names import folded, loose
from gasapi.gases.reading import DataError, Table
from gasapi.gases.records import Constant, Gas, Hazard, Substance
from gasapi.gases.substance_files import HAZARD_TAGS, pure_gas

__all__ = ["Site", "load_site"]

_LARGEST_FILE = 1_000_000
_ID = re.compile(r"[a-z0-9]+(-[a-z0-9]+)*")
_WHOLE = {"1": 1.0, "%": 100.0, "ppm": 1e6}
_SUM_TOLERANCE = 1e-6
# from above the highest towns to the deepest mines; a pressure in bar or mbar typed by mistake lies far outside
_AMBIENT_PRESSURE = (40_000.0, 150_000.0)
_SITE_FILE = "the site file"


@dataclass(frozen=True, slots=True)
class Site:
    """What a site file says.

    ``gases`` are named mixtures, ``substances`` pure gases with constants of their own, both of kind ``site``;
    ``ambient_pressure`` in Pa and ``dew_point_margin`` in K, None where the file is silent; ``hash`` is ``sha256:...`` over
    the bytes of the file.
    """

    file: str
    gases: tuple[Gas, ...]
    substances: tuple[Gas, ...]
    ambient_pressure: float | None
    dew_point_margin: float | None
    hash: str


def load_site(path: str | Path, catalogue: Catalogue) -> Site:
    """Return what a site file says, checked against the catalogue.

    :param path: the TOML file
    :param catalogue: the catalogue without site gases, in which the names of components are looked up
    :raises DataError: the file cannot be read, or something in it cannot be right
    """
    file = Path(path).name
    content = _read(Path(path), file)
    try:
        members = tomllib.loads(content.decode("utf-8"))
    except UnicodeDecodeError as error:
        raise DataError(file, "", f"must be UTF-8 text; byte {error.start} is not") from None
    except tomllib.TOMLDecodeError as error:
        raise DataError(file, "", f"is not TOML: {error}") from None
    table = Table(members, file)
    ambient_pressure, dew_point_margin = _settings(table.optional_table("site"))
    taken = _TakenNames(catalogue)
    substances = tuple(_substance(item, taken) for item in _children(table.optional_table("substances")))
    # a catalogue of its own, so that a gas of the site can be made of the substances of the site
    known = Catalogue((*catalogue.gases, *substances))
    gases = tuple(_gas(item, known, taken) for item in _children(table.optional_table("gases")))
    table.close()
    return Site(
        file=file,
        gases=gases,
        substances=substances,
        ambient_pressure=ambient_pressure,
        dew_point_margin=dew_point_margin,
        hash=f"sha256:{hashlib.sha256(content).hexdigest()}",
    )


def _read(path: Path, file: str) -> bytes:
    try:
        with path.open("rb") as stream:
            content = stream.read(_LARGEST_FILE + 1)
    except OSError as error:
        raise DataError(file, "", f"cannot be read: {error.strerror or 'unknown reason'}") from None
    if len(content) > _LARGEST_FILE:
        raise DataError(file, "", f"is larger than {_LARGEST_FILE} bytes, which no site file needs to be")
    return content


def _children(table: Table | None) -> list[tuple[str, Table]]:
    if table is None:
        return []
    return [(key, table.table(key)) for key in table.members]


class _TakenNames:
    """Which names are taken: by the catalogue, and by what stands further up in the same file."""

    def __init__(self, catalogue: Catalogue) -> None:
        self._catalogue = catalogue
        self._own: dict[str, str] = {}

    def claim(self, table: Table, key: str, name: str, id: str) -> None:
        """Raise DataError where a name means another gas already."""
        try:
            holder = self._catalogue.find(name).id
        except AmbiguousName as error:
            raise table.fault(key, f"{name!r} is a formula of the catalogue ({', '.join(error.nearest)})") from None
        except UnknownGas:
            holder = self._own.setdefault(loose(name), id)
            if holder == id:
                return
        raise table.fault(key, f"the name {name!r} belongs to {holder} already; choose another")


def _settings(table: Table | None) -> tuple[float | None, float | None]:
    if table is None:
        return None, None
    ambient = table.optional_number("ambient_pressure")
    low, high = _AMBIENT_PRESSURE
    if ambient is not None and not low <= ambient <= high:
        raise table.fault("ambient_pressure", f"is {ambient:g}, must lie within {low:g} and {high:g} Pa")
    margin = table.optional_number("dew_point_margin")
    if margin is not None and not 0.0 <= margin <= 100.0:
        raise table.fault("dew_point_margin", f"is {margin:g}, must lie within 0 and 100 K")
    table.close()
    return ambient, margin


def _identity(id: str, table: Table, taken: _TakenNames) -> tuple[str, tuple[str, ...], str]:
    """Return name, synonyms and description, with all names claimed."""
    if not _ID.fullmatch(id):
        raise table.fault("", "must be called by lower-case letters, digits and single hyphens, as in fuel-gas")
    name = table.optional_text("name") or id
    synonyms = table.texts("synonyms") if table.has("synonyms") else ()
    taken.claim(table, "", id, id)
    if folded(name) != folded(id):
        taken.claim(table, "name", name, id)
    for synonym in synonyms:
        taken.claim(table, "synonyms", synonym, id)
    return name, synonyms, table.optional_text("description") or ""


def _substance(item: tuple[str, Table], taken: _TakenNames) -> Gas:
    id, table = item
    name, synonyms, description = _identity(id, table, taken)
    hazards = table.texts("hazards") if table.has("hazards") else ()
    for tag in hazards:
        if tag not in HAZARD_TAGS:
            raise table.fault("hazards", f"holds {tag!r}; known hazards: {', '.join(HAZARD_TAGS)}")
    substance = Substance(
        id=id,
        molar_mass=table.number("molar_mass", 1.0, 1000.0) / 1000.0,
        critical_temperature=table.number("critical_temperature", 1.0, 2000.0),
        critical_pressure=table.number("critical_pressure", 1e4, 1e8),
        acentric_factor=table.number("acentric_factor", -1.0, 2.0),
        critical_volume=table.optional_number("critical_volume", 1e-5, 1e-2),
        dipole_moment=table.optional_number("dipole_moment", 0.0, 10.0),
    )
    table.close()
    tags = tuple(tag for tag in HAZARD_TAGS if tag in hazards)
    hazard = Hazard(tags=tags, basis=tuple((tag, _SITE_FILE) for tag in tags))
    return pure_gas(substance, name, _SITE_FILE, kind="site", synonyms=synonyms, hazard=hazard, description=description)


def _gas(item: tuple[str, Table], known: Catalogue, taken: _TakenNames) -> Gas:
    id, table = item
    name, synonyms, description = _identity(id, table, taken)
    basis = table.choice("basis", ("mole", "mass")) if table.has("basis") else "mole"
    unit = table.choice("fraction_unit", _WHOLE) if table.has("fraction_unit") else "1"
    given = _fractions(table, _WHOLE[unit], known, by_mass=basis == "mass")
    table.close()
    blend = _mole_fractions(given, known) if basis == "mass" else given
    molar_mass = 0.0
    for component, fraction in blend.items():
        molar_mass += fraction * known.substance(component).molar_mass
    words = "computed from the composition with the molar masses of the catalogue"
    return Gas(
        id=id,
        name=name,
        formula=None,
        cas=None,
        synonyms=synonyms,
        kind="site",
        substance=None,
        blend=tuple(blend.items()),
        constants=(("molar_mass", Constant(molar_mass * 1000.0, "g/mol", words)),),
        description=description,
        mass_fractions=tuple(given.items()) if basis == "mass" else None,
    )


def _fractions(table: Table, whole: float, known: Catalogue, *, by_mass: bool) -> dict[str, float]:
    """Return fractions by id that sum to 1 to the last bits, in the order of the file; a blend stands for its components."""
    fractions = table.table("fractions")
    given: list[float] = []
    merged: dict[str, float] = {}
    seen: dict[str, str] = {}
    for key in fractions.members:
        fraction = fractions.number(key, 0.0) / whole
        try:
            gas = known.find(key)
        except UnknownGas as error:
            raise fractions.fault(key, str(error)) from None
        if seen.setdefault(gas.id, key) != key:
            raise fractions.fault(key, f"is {gas.id}, which {seen[gas.id]!r} names already; add them up")
        given.append(fraction)
        parts = known.components(gas)
        shares = _mass_shares(parts, known) if by_mass else dict(parts)
        for component, share in shares.items():
            merged[component] = merged.get(component, 0.0) + fraction * share
    total = math.fsum(given)
    if abs(total - 1.0) > _SUM_TOLERANCE:
        raise fractions.fault("", f"sum to {total * whole:.9g}, must sum to {whole:g} (within 1 part in a million)")
    merged = {component: fraction for component, fraction in merged.items() if fraction > 0.0}
    exact = math.fsum(merged.values())
    return {component: fraction / exact for component, fraction in merged.items()}


def _mass_shares(parts: tuple[tuple[str, float], ...], known: Catalogue) -> dict[str, float]:
    masses = {component: fraction * known.substance(component).molar_mass for component, fraction in parts}
    total = math.fsum(masses.values())
    return {component: mass / total for component, mass in masses.items()}


def _mole_fractions(masses: Mapping[str, float], known: Catalogue) -> dict[str, float]:
    amounts = {component: fraction / known.substance(component).molar_mass for component, fraction in masses.items()}
    total = math.fsum(amounts.values())
    return {component: amount / total for component, amount in amounts.items()}
