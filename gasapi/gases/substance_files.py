"""The files of pure gases and of named blends, checked and turned into catalogue entries."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from functools import cache

from gasapi.gases.data_files import open_data
from gasapi.gases.reading import DataError, Table
from gasapi.gases.records import Constant, Gas, Hazard, Substance

__all__ = ["HAZARD_TAGS", "MOLAR_GAS_CONSTANT", "load_blends", "load_substances", "pure_gas"]

MOLAR_GAS_CONSTANT = 8.314462618
"""J/mol/K, CODATA 2018, as the generalised equations take it."""

HAZARD_TAGS = ("flammable", "toxic", "corrosive", "oxidizer", "asphyxiant", "pyrophoric")

_FLAGS = ("quantum", "associating", "decomposes")
_GRADES = ("A", "B", "C", "D")
_CARCINOGEN_GROUPS = ("1", "2A", "2B")

# member of the file, name of the constant, unit, lowest and highest sensible value
_QUANTITIES = (
    ("molar_mass_g_per_mol", "molar_mass", "g/mol", 1.0, 1000.0),
    ("critical_temperature_K", "critical_temperature", "K", 1.0, 2000.0),
    ("critical_pressure_Pa", "critical_pressure", "Pa", 1e4, 1e8),
    ("acentric_factor", "acentric_factor", "1", -1.0, 2.0),
    ("critical_volume_m3_per_mol", "critical_volume", "m3/mol", 1e-5, 1e-2),
    ("dipole_moment_D", "dipole_moment", "D", 0.0, 10.0),
    ("boiling_temperature_K", "boiling_temperature", "K", 1.0, 1000.0),
    ("sublimation_temperature_K", "sublimation_temperature", "K", 1.0, 1000.0),
    ("triple_temperature_K", "triple_temperature", "K", 1.0, 1000.0),
    ("triple_pressure_Pa", "triple_pressure", "Pa", 0.0, 1e7),
    ("melting_temperature_K", "melting_temperature", "K", 1.0, 1000.0),
)
_REQUIRED = ("molar_mass_g_per_mol", "critical_temperature_K", "critical_pressure_Pa", "acentric_factor")

_FIGURES = (
    ("lower_flammable_limit", "lower_flammable_limit", "1", 0.0, 1.0),
    ("upper_flammable_limit", "upper_flammable_limit", "1", 0.0, 1.0),
    ("autoignition_temperature_K", "autoignition_temperature", "K", 273.15, 2000.0),
    ("exposure_limit_average_ppm", "exposure_limit_average", "ppm", 0.0, 1e6),
    ("exposure_limit_short_term_ppm", "exposure_limit_short_term", "ppm", 0.0, 1e6),
    ("exposure_limit_ceiling_ppm", "exposure_limit_ceiling", "ppm", 0.0, 1e6),
)

_COMPUTED = "computed from critical constants"


@cache
def load_substances() -> tuple[Gas, ...]:
    """Return the pure gases and vapours of the catalogue, in the order of the file.

    :raises DataError: the file does not hold what it must
    """
    return _read_substances()


def _read_substances() -> tuple[Gas, ...]:
    table = open_data("substances.json")
    for word in ("title", "read_from", "units_note", "hazard_note"):
        table.text(word)
    table.texts_by_key("grades")
    table.texts_by_key("flags")
    sources = table.texts_by_key("sources")
    gases = tuple(_substance(item, sources) for item in table.tables("substances"))
    table.close()
    _refuse_twice(gases, table)
    return gases


@cache
def load_blends() -> tuple[Gas, ...]:
    """Return the named blends of the catalogue, in the order of the file.

    :raises DataError: the file does not hold what it must, among it fractions that sum to 1
    """
    return _read_blends()


def _read_blends() -> tuple[Gas, ...]:
    pure = {gas.id: gas for gas in load_substances()}
    table = open_data("blends.json")
    table.text("title")
    sources = table.texts_by_key("sources")
    gases = tuple(_blend(item, sources, pure) for item in table.tables("blends"))
    table.close()
    _refuse_twice(gases, table)
    return gases


def pure_gas(
    substance: Substance,
    name: str,
    source: str,
    *,
    kind: str = "pure",
    synonyms: tuple[str, ...] = (),
    hazard: Hazard | None = None,
    description: str = "",
) -> Gas:
    """Return the catalogue entry of a substance that somebody brings along, with one source for all its constants.

    :param substance: its constants
    :param name: how people call it
    :param source: where its constants come from, in words
    :param kind: ``pure`` or ``site``
    """
    given: tuple[tuple[str, float | None, str], ...] = (
        ("molar_mass", substance.molar_mass * 1000.0, "g/mol"),
        ("critical_temperature", substance.critical_temperature, "K"),
        ("critical_pressure", substance.critical_pressure, "Pa"),
        ("acentric_factor", substance.acentric_factor, "1"),
        ("critical_volume", substance.critical_volume, "m3/mol"),
        ("dipole_moment", substance.dipole_moment, "D"),
    )
    constants = {key: Constant(value, unit, source) for key, value, unit in given if value is not None}
    return Gas(
        id=substance.id,
        name=name,
        formula=None,
        cas=None,
        synonyms=synonyms,
        kind="site" if kind == "site" else "pure",
        substance=substance,
        blend=None,
        constants=_with_van_der_waals(constants),
        hazard=hazard or Hazard(),
        description=description,
    )


def _substance(table: Table, sources: Mapping[str, str]) -> Gas:
    constants: dict[str, Constant] = {}
    for key, name, unit, low, high in _QUANTITIES:
        if key in _REQUIRED or table.has(key):
            constants[name] = _sourced(table, key, unit, low, high, sources)
    values = {name: constant.value for name, constant in constants.items()}
    id = table.text("id")
    substance = Substance(
        id=id,
        molar_mass=values["molar_mass"] / 1000.0,
        critical_temperature=values["critical_temperature"],
        critical_pressure=values["critical_pressure"],
        acentric_factor=values["acentric_factor"],
        critical_volume=values.get("critical_volume"),
        dipole_moment=values.get("dipole_moment"),
        triple_temperature=values.get("triple_temperature"),
        triple_pressure=values.get("triple_pressure"),
        melting_temperature=values.get("melting_temperature"),
        grade=table.choice("grade", _GRADES),
        flags=_flags(table),
    )
    gas = Gas(
        id=id,
        name=table.text("name"),
        formula=table.text("formula"),
        cas=table.text("cas"),
        synonyms=table.texts("synonyms"),
        kind="pure",
        substance=substance,
        blend=None,
        constants=_with_van_der_waals(constants),
        hazard=_hazard(table.table("hazard"), sources),
    )
    table.close()
    return gas


def _sourced(table: Table, key: str, unit: str, low: float, high: float, sources: Mapping[str, str]) -> Constant:
    value, words = table.sourced_number(key, sources, low, high)
    return Constant(value, unit, words)


def _with_van_der_waals(constants: Mapping[str, Constant]) -> tuple[tuple[str, Constant], ...]:
    # a = 27 R^2 Tc^2 / (64 pc), b = R Tc / (8 pc): the isotherm through the critical point has zero slope and curvature there
    product = MOLAR_GAS_CONSTANT * constants["critical_temperature"].value
    pressure = constants["critical_pressure"].value
    attraction = Constant(27.0 * product * product / (64.0 * pressure), "Pa m6/mol2", _COMPUTED)
    covolume = Constant(product / (8.0 * pressure), "m3/mol", _COMPUTED)
    return (*constants.items(), ("van_der_waals_a", attraction), ("van_der_waals_b", covolume))


def _flags(table: Table) -> frozenset[str]:
    flags = table.texts("flags") if table.has("flags") else ()
    for flag in flags:
        if flag not in _FLAGS:
            raise table.fault("flags", f"holds {flag!r}, may hold {', '.join(_FLAGS)}")
    return frozenset(flags)


def _hazard(table: Table, sources: Mapping[str, str]) -> Hazard:
    tags = table.table("tags")
    for tag in tags.members:
        if tag not in HAZARD_TAGS:
            raise tags.fault(tag, f"is no hazard tag; tags: {', '.join(HAZARD_TAGS)}")
    basis = tuple((tag, sources[tags.choice(tag, sources)]) for tag in HAZARD_TAGS if tag in tags.members)
    figures = tuple(
        (name, _sourced(table, key, unit, low, high, sources)) for key, name, unit, low, high in _FIGURES if table.has(key)
    )
    hazard = Hazard(
        tags=tuple(tag for tag, _ in basis),
        basis=basis,
        figures=figures,
        carcinogen_group=table.choice("carcinogen_group", _CARCINOGEN_GROUPS) if table.has("carcinogen_group") else None,
        absorbed_through_skin=table.flag("absorbed_through_skin") if table.has("absorbed_through_skin") else False,
        remarks=table.texts("remarks") if table.has("remarks") else (),
    )
    table.close()
    return hazard


def _blend(table: Table, sources: Mapping[str, str], pure: Mapping[str, Gas]) -> Gas:
    source = sources[table.choice("source", sources)]
    fractions = table.table("fractions")
    for id in fractions.members:
        if id not in pure:
            raise fractions.fault(id, "is no id of a pure gas")
    blend = tuple((id, fractions.number(id, 1e-12, 1.0)) for id in fractions.members)
    if abs(sum(fraction for _, fraction in blend) - 1.0) > 1e-12:
        raise fractions.fault("", "must sum to 1")
    gas = Gas(
        id=table.text("id"),
        name=table.text("name"),
        formula=None,
        cas=table.optional_text("cas"),
        synonyms=table.texts("synonyms"),
        kind="blend",
        substance=None,
        blend=blend,
        constants=(("molar_mass", _molar_mass(blend, pure)),),
        description=f"{table.text('description')} Composition: {source}.",
    )
    table.close()
    return gas


def _molar_mass(blend: Iterable[tuple[str, float]], pure: Mapping[str, Gas]) -> Constant:
    total = 0.0
    for id, fraction in blend:
        total += fraction * dict(pure[id].constants)["molar_mass"].value
    return Constant(total, "g/mol", "computed from the composition with the molar masses of this catalogue")


def _refuse_twice(gases: Iterable[Gas], table: Table) -> None:
    seen: set[str] = set()
    for gas in gases:
        if gas.id in seen:
            raise DataError(table.file, gas.id, "this id stands here twice")
        seen.add(gas.id)
