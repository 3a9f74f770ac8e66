"""The files of reference equations and of GERG-2008, checked and turned into records.

A reference equation is read when it is first asked for, one file at a time, so that a start costs what it uses.
"""

from __future__ import annotations

from functools import cache
from typing import Literal, cast

from gasapi.errors import UnknownGas
from gasapi.gases.data_files import names_of_files, open_data
from gasapi.gases.reading import Table
from gasapi.gases.records import (
    BubbleDewCurve,
    DensityUncertainty,
    Departure,
    FixedPoint,
    GergComponent,
    GergData,
    GergPair,
    Limits,
    ReferenceEquation,
    ResidualTerm,
    SaturationPiece,
    SaturationTable,
    SublimationCurve,
)

__all__ = ["load_gerg", "load_reference", "reference_ids"]

_TERM_FIELDS: dict[str, tuple[str, ...]] = {
    "monomial": ("n", "d", "t"),
    "damped": ("n", "d", "t", "g", "l"),
    "damped_both": ("n", "d", "t", "gd", "ld", "gt", "lt"),
    "gaussian": ("n", "d", "t", "eta", "epsilon", "beta", "gamma"),
    "gaussian_reciprocal": ("n", "d", "t", "eta", "epsilon", "beta", "gamma", "b"),
    "density_gaussian": ("n", "d", "t", "eta", "epsilon", "beta", "gamma"),
    "nonanalytic": ("n", "a", "b", "beta", "A", "B", "C", "D"),
}
"""The columns of a block of terms, in the order of ``ResidualTerm.parameters``."""

_PHASES = ("gas", "fluid")
_UNCERTAINTY_BASES = ("publication", "from memory", "estimate")
_PAIR_BASES = ("fitted", "linear", "lorentz-berthelot")
_EQUATION_CLASSES = ("reference", "multiparameter", "technical-short", "bender", "mbwr")


@cache
def reference_ids() -> tuple[str, ...]:
    """Return the ids of all gases with a reference equation, in alphabetical order."""
    return names_of_files("reference")


@cache
def load_reference(id: str) -> ReferenceEquation:
    """Return the reference equation of a gas.

    :param id: one of ``reference_ids()``
    :raises UnknownGas: there is no equation with this id
    :raises DataError: its file does not hold what it must
    """
    if id not in reference_ids():
        raise UnknownGas(id)
    return _read_reference(id)


def _read_reference(id: str) -> ReferenceEquation:
    table = open_data(f"reference/{id}.json")
    if table.text("id") != id:
        raise table.fault("id", f"is {table.text('id')!r}, must be {id!r} as the name of the file says")
    validity = _limits(table, "validity")
    extended = _limits(table, "extended")
    if extended.temperature_max < validity.temperature_max or extended.pressure_max < validity.pressure_max:
        raise table.fault("extended", "must hold the range of validity within it")
    acentric = table.table("acentric_factor")
    acentric_factor = acentric.number("value", -1.0, 2.0)
    acentric.text("basis")
    acentric.close()
    saturation, bubble_dew = _saturation(table.table("saturation"))
    equation = ReferenceEquation(
        id=id,
        name=table.text("name"),
        kind=cast(Literal["pure", "pseudo-pure"], table.choice("kind", ("pure", "pseudo-pure"))),
        molar_mass=table.positive("molar_mass_kg_per_mol"),
        gas_constant=table.number("gas_constant_J_per_mol_K", 8.31, 8.32),
        reducing_temperature=table.positive("reducing_temperature_K"),
        reducing_density=table.positive("reducing_density_mol_per_m3"),
        terms=_terms(table),
        critical=_point(table.table("critical")),
        critical_published=_point(table.table("critical_published")),
        triple=_point(table.table("triple"), with_density=False) if table.has("triple") else None,
        acentric_factor=acentric_factor,
        validity=validity,
        extended=extended,
        uncertainties=_uncertainties(table),
        saturation=saturation,
        bubble_dew=bubble_dew,
        sublimation=_sublimation(table.table("sublimation")) if table.has("sublimation") else None,
        citation=_citation(table.table("citation")),
        equation_class=table.choice("equation_class", _EQUATION_CLASSES),
        notes=table.texts("notes"),
    )
    table.close()
    return equation


@cache
def load_gerg() -> GergData:
    """Return the coefficients of GERG-2008.

    :raises DataError: the file does not hold what it must, among it every pair of components exactly once
    """
    return _read_gerg()


def _read_gerg() -> GergData:
    table = open_data("gerg_2008.json")
    for word in ("title", "read_from"):
        table.text(word)
    table.texts("notes")
    components = tuple(_gerg_component(item) for item in table.tables("components"))
    index = {component.id: place for place, component in enumerate(components)}
    if len(index) != len(components):
        raise table.fault("components", "must name each component once")
    departures = tuple(_departure(item) for item in table.tables("departures"))
    known = {departure.id for departure in departures}
    pairs = tuple(_gerg_pair(item, index, known) for item in table.tables("pairs"))
    wanted = {(i, j) for i in range(len(components)) for j in range(i + 1, len(components))}
    if len(pairs) != len(wanted) or {(pair.i, pair.j) for pair in pairs} != wanted:
        raise table.fault("pairs", f"must hold each of the {len(wanted)} pairs of components once")
    data = GergData(
        gas_constant=table.number("gas_constant_J_per_mol_K", 8.31, 8.32),
        components=components,
        pairs=pairs,
        departures=departures,
        validity=_limits(table, "validity"),
        extended=_limits(table, "extended"),
        uncertainties=_uncertainties(table),
        citation=_citation(table.table("citation")),
    )
    table.close()
    return data


def _point(table: Table, with_density: bool = True) -> FixedPoint:
    point = FixedPoint(
        temperature=table.positive("temperature_K"),
        pressure=table.optional_positive("pressure_Pa"),
        density=table.positive("density_mol_per_m3") if with_density else None,
    )
    table.close()
    return point


def _limits(parent: Table, key: str) -> Limits:
    table = parent.table(key)
    limits = Limits(
        temperature_min=table.positive("temperature_min_K"),
        temperature_max=table.positive("temperature_max_K"),
        pressure_max=table.positive("pressure_max_Pa"),
        basis=table.text("basis"),
    )
    if limits.temperature_min >= limits.temperature_max:
        raise table.fault("temperature_min_K", "must lie below temperature_max_K")
    table.close()
    return limits


def _uncertainties(parent: Table) -> tuple[DensityUncertainty, ...]:
    entries = []
    for table in parent.tables("density_uncertainty"):
        entries.append(
            DensityUncertainty(
                relative=table.number("relative", 1e-6, 0.5),
                phase=cast(Literal["gas", "fluid"], table.choice("phase", _PHASES)),
                temperature_min=table.optional_positive("temperature_min_K"),
                temperature_max=table.optional_positive("temperature_max_K"),
                pressure_max=table.optional_positive("pressure_max_Pa"),
                basis=table.choice("basis", _UNCERTAINTY_BASES),
            )
        )
        table.close()
    last = entries[-1]
    if last.phase != "fluid" or (last.temperature_min, last.temperature_max, last.pressure_max) != (None, None, None):
        raise parent.fault("density_uncertainty", "must end with an entry that holds for every state")
    return tuple(entries)


def _terms(parent: Table) -> tuple[ResidualTerm, ...]:
    terms: list[ResidualTerm] = []
    for block in parent.tables("residual"):
        kind = block.choice("kind", _TERM_FIELDS)
        fields = _TERM_FIELDS[kind]
        if block.texts("fields") != fields:
            raise block.fault("fields", f"must be {', '.join(fields)} for terms of kind {kind}")
        for row in block.rows("terms", len(fields)):
            if kind == "nonanalytic":
                terms.append(ResidualTerm(kind, row[0], 0.0, 0.0, row[1:]))
            else:
                terms.append(ResidualTerm(kind, row[0], row[1], row[2], row[3:]))
        block.close()
    return tuple(terms)


def _saturation(table: Table) -> tuple[SaturationTable | None, BubbleDewCurve | None]:
    if table.choice("form", ("chebyshev", "bubble-dew")) == "bubble-dew":
        return None, _bubble_dew(table)
    error = table.table("max_relative_error")
    for name in ("pressure", "liquid_density", "vapour_density"):
        error.number(name, 0.0, 1e-3)
    error.close()
    pieces = []
    for item in table.tables("pieces"):
        pieces.append(
            SaturationPiece(
                low=item.number("low", 0.0, 1.0),
                high=item.number("high", 0.0, 1.0),
                log_pressure=item.numbers("log_pressure"),
                liquid_density=item.numbers("liquid_density"),
                log_vapour_density=item.numbers("log_vapour_density"),
            )
        )
        item.close()
    edges = [0.0, *(piece.high for piece in pieces)]
    if [piece.low for piece in pieces] != edges[:-1] or sorted(set(edges)) != edges:
        raise table.fault("pieces", "must rise from 0 and join without a gap")
    curve = SaturationTable(
        critical=_point(table.table("critical")),
        temperature_min=table.positive("temperature_min_K"),
        pieces=tuple(pieces),
    )
    table.close()
    return curve, None


def _bubble_dew(table: Table) -> BubbleDewCurve:
    curve = BubbleDewCurve(
        reducing=_point(table.table("reducing")),
        temperature_min=table.positive("temperature_min_K"),
        temperature_max=table.positive("temperature_max_K"),
        bubble_pressure=_pairs(table, "bubble_pressure"),
        dew_pressure=_pairs(table, "dew_pressure"),
        bubble_density=_pairs(table, "bubble_density"),
        bubble_density_log=table.number("bubble_density_log"),
        dew_density=_pairs(table, "dew_density"),
    )
    table.close()
    return curve


def _sublimation(table: Table) -> SublimationCurve:
    curve = SublimationCurve(
        triple=_point(table.table("triple"), with_density=False),
        argument=cast(Literal["complement", "ratio"], table.choice("argument", ("complement", "ratio"))),
        terms=_pairs(table, "terms"),
        temperature_min=table.positive("temperature_min_K"),
        basis=table.text("basis"),
    )
    table.close()
    return curve


def _pairs(table: Table, key: str) -> tuple[tuple[float, float], ...]:
    return tuple((row[0], row[1]) for row in table.rows(key, 2))


def _citation(table: Table) -> str:
    table.text("title")
    authors = ", ".join(table.texts("authors"))
    source = table.text("source")
    volume = table.optional_text("volume")
    pages = table.optional_text("pages")
    doi = table.optional_text("doi")
    see_also = table.optional_text("see_also")
    basis = table.optional_text("basis")
    words = f"{authors}, {source}{f' {volume}' if volume else ''} ({table.whole('year')})"
    words += f" {pages}" if pages else ""
    words += f", doi {doi}" if doi else ""
    words += f"; {see_also}" if see_also else ""
    if basis not in (None, "bibliography"):
        words += f" [basis of this citation: {basis}]"
    table.close()
    return words


def _gerg_component(table: Table) -> GergComponent:
    table.text("formula")
    table.text("cas")
    component = GergComponent(
        id=table.text("id"),
        molar_mass=table.positive("molar_mass_kg_per_mol"),
        critical_temperature=table.positive("critical_temperature_K"),
        critical_density=table.positive("critical_density_mol_per_m3"),
        terms=_terms(table),
    )
    table.close()
    return component


def _departure(table: Table) -> Departure:
    departure = Departure(id=table.text("id"), terms=_terms(table))
    table.close()
    return departure


def _gerg_pair(table: Table, index: dict[str, int], departures: set[str]) -> GergPair:
    first, second = table.choice("i", index), table.choice("j", index)
    departure = table.choice("departure", departures) if table.has("departure") else None
    factor = table.number("factor")
    if (factor == 0.0) != (departure is None):
        raise table.fault("departure", "must be null where the factor is 0, and only there")
    pair = GergPair(
        i=index[first],
        j=index[second],
        beta_v=table.positive("beta_v"),
        gamma_v=table.positive("gamma_v"),
        beta_t=table.positive("beta_t"),
        gamma_t=table.positive("gamma_t"),
        factor=factor,
        departure=departure,
        basis=table.choice("basis", _PAIR_BASES),
    )
    table.close()
    return pair
