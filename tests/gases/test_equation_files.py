"""The files of reference equations and of GERG-2008: every entry loads, and what is wrong is refused."""

from __future__ import annotations

import copy
import shutil
from collections.abc import Callable
from pathlib import Path
from typing import Any

import orjson
import pytest
from CoolProp import CoolProp

from gasapi.errors import UnknownGas
from gasapi.gases import data_files, equation_files
from gasapi.gases.equation_files import load_gerg, load_reference, reference_ids
from gasapi.gases.reading import DataError

# the number of parameters beside n, d, t of each kind; nonanalytic has no d and t
PARAMETERS = {"monomial": 0, "damped": 2, "damped_both": 4, "gaussian": 4, "gaussian_reciprocal": 5, "density_gaussian": 4}

# names by which the independent library calls the fluids whose CAS number does not find them
LIBRARY_NAMES = {"parahydrogen": "ParaHydrogen", "air": "Air", "isohexane": "Isohexane", "hydrogen": "Hydrogen"}


def test_all_eighty_equations_are_there() -> None:
    """Eighty gases have a reference equation."""
    assert 80 == len(reference_ids()) == len(set(reference_ids()))


@pytest.mark.parametrize("id", reference_ids())
def test_every_reference_equation_loads(id: str) -> None:
    """Every file gives a record with terms of known kinds, a range, an uncertainty for every state and a citation."""
    equation = load_reference(id)
    assert id == equation.id
    for term in equation.terms:
        expected = 7 if term.kind == "nonanalytic" else PARAMETERS[term.kind]
        assert expected == len(term.parameters)
    last = equation.uncertainties[-1]
    assert (last.phase, last.temperature_min, last.temperature_max, last.pressure_max) == ("fluid", None, None, None)
    assert (equation.saturation is None) == (equation.bubble_dew is not None) == (equation.kind == "pseudo-pure")
    assert 12 <= len(equation.terms) <= 56
    assert f"({equation.citation.split('(')[-1][:4]}" in equation.citation


@pytest.mark.parametrize("id", [id for id in reference_ids() if id != "air"])
def test_saturation_table_ends_at_the_critical_point_and_reaches_down(id: str) -> None:
    """The pieces join from s = 0 to the lowest temperature, where the table's pressure meets the triple pressure."""
    table = load_reference(id).saturation
    assert table is not None
    lowest = (1.0 - table.temperature_min / table.critical.temperature) ** 0.5
    assert lowest == pytest.approx(table.pieces[-1].high, rel=1e-9)
    critical = load_reference(id).critical
    assert critical.temperature == pytest.approx(table.critical.temperature, rel=1e-8)
    assert critical.density == pytest.approx(table.critical.density, rel=1e-6)


@pytest.mark.parametrize("id", reference_ids())
def test_fixed_points_agree_with_an_independent_library(id: str) -> None:
    """Molar mass, reducing point and accepted critical temperature are those that CoolProp gives for the same fluid.

    Outside the tolerance of 0.05 %: equations of which CoolProp holds a newer or another form, with its own figures.
    """
    equation = load_reference(id)
    other = library_name(id)
    assert equation.molar_mass == pytest.approx(CoolProp.PropsSI("molar_mass", other), rel=2e-4)
    assert equation.critical_published.temperature == pytest.approx(CoolProp.PropsSI("Tcrit", other), rel=6e-3)
    assert equation.validity.temperature_max >= 300.0


def library_name(id: str) -> str:
    if id in LIBRARY_NAMES:
        return LIBRARY_NAMES[id]
    from gasapi.gases.substance_files import load_substances

    (cas,) = [gas.cas for gas in load_substances() if gas.id == id]
    names = CoolProp.get_global_param_string("fluids_list").split(",")
    (name,) = [name for name in names if CoolProp.get_fluid_param_string(name, "CAS") == cas]
    return name


def test_water_is_the_published_release() -> None:
    """IAPWS R6-95(2018), table 1 and section 4: Tc 647.096 K, rhoc 322 kg/m3, R 0.46151805 kJ/(kg K), 56 terms."""
    water = load_reference("water")
    assert water.reducing_temperature == 647.096
    assert pytest.approx(water.reducing_density * water.molar_mass, rel=1e-9) == 322.0
    assert pytest.approx(water.gas_constant / water.molar_mass, rel=1e-9) == 461.51805
    assert len(water.terms) == 56
    # table 2, first and last of the coefficients n
    assert (water.terms[0].n, water.terms[-1].n) == (0.12533547935523e-1, 0.31806110878444)
    assert water.terms[-1].kind == "nonanalytic"


def test_only_carbon_dioxide_and_water_have_a_sublimation_curve() -> None:
    """The curve of water starts at its triple point, 611.657 Pa at 273.16 K (IAPWS R14-08(2011))."""
    assert [id for id in reference_ids() if load_reference(id).sublimation is not None] == ["carbon-dioxide", "water"]
    curve = load_reference("water").sublimation
    assert curve is not None
    assert (curve.argument, curve.triple.temperature, curve.triple.pressure) == ("ratio", 273.16, 611.657)


@pytest.mark.parametrize("id", ["unobtainium", "", "../substances", "Methane", "../reference/methane"])
def test_unknown_reference_is_refused_without_touching_a_file(id: str) -> None:
    """Only the ids in the list are looked for, so that no text of a caller ever becomes a path."""
    with pytest.raises(UnknownGas):
        load_reference(id)


def test_gerg_has_all_components_pairs_and_departures() -> None:
    """ISO 20765-2: 21 components, 210 pairs, 15 of them with a departure function, of which there are 8."""
    data = load_gerg()
    assert (len(data.components), len(data.pairs), len(data.departures)) == (21, 210, 8)
    assert sum(pair.departure is not None for pair in data.pairs) == 15
    assert data.gas_constant == 8.314472
    assert (data.validity.temperature_min, data.validity.temperature_max, data.validity.pressure_max) == (90.0, 450.0, 35e6)
    assert (data.extended.temperature_min, data.extended.temperature_max, data.extended.pressure_max) == (60.0, 700.0, 70e6)


def test_gerg_pairs_stand_in_order() -> None:
    """Every pair has i < j, so that beta belongs to a known direction."""
    pairs = [(pair.i, pair.j) for pair in load_gerg().pairs]
    assert [(i, j) for i in range(21) for j in range(i + 1, 21)] == sorted(pairs)


@pytest.mark.parametrize(
    ("id", "molar_mass", "temperature", "density"),
    [
        ("methane", 0.01604246, 190.564, 10139.342719),
        ("nitrogen", 0.0280134, 126.192, 11183.9),
        ("carbon-dioxide", 0.0440095, 304.1282, 10624.978698),
        ("hydrogen", 0.00201588, 33.19, 14940.0),
        ("argon", 0.039948, 150.687, 13407.429659),
    ],
)
def test_gerg_components_are_the_published_ones(id: str, molar_mass: float, temperature: float, density: float) -> None:
    """Kunz and Wagner 2012, table A5 (from memory), in SI units."""
    (component,) = [c for c in load_gerg().components if c.id == id]
    assert (molar_mass, temperature, density) == (
        component.molar_mass,
        component.critical_temperature,
        component.critical_density,
    )


def test_gerg_uncertainty_is_stated_for_the_gas_phase() -> None:
    """0.1 % between 250 and 450 K up to 35 MPa, 0.5 % elsewhere (both from memory, and said to be)."""
    first, second, last = load_gerg().uncertainties
    assert (
        first.relative,
        first.phase,
        first.temperature_min,
        first.temperature_max,
        first.pressure_max,
    ) == (0.001, "gas", 250.0, 450.0, 35e6)
    assert (second.relative, last.relative) == (0.005, 0.005)
    assert {"from memory"} == {entry.basis for entry in (first, second, last)}


def test_records_are_kept_and_shared() -> None:
    """A second call gives the very same record, which is safe because it cannot be changed."""
    assert load_reference("argon") is load_reference("argon")
    assert load_gerg() is load_gerg()
    hash(load_reference("argon"))


Change = Callable[[dict[str, Any]], object]


@pytest.fixture
def spoiled(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Callable[[str, Change], None]:
    """Put a changed copy of a data file in the place of the package's data."""
    original = data_files._DATA
    monkeypatch.setattr(data_files, "_DATA", tmp_path)

    def spoil(name: str, change: Change) -> None:
        content = orjson.loads((original / name).read_bytes())
        change(content)
        (tmp_path / name).parent.mkdir(exist_ok=True)
        (tmp_path / name).write_bytes(orjson.dumps(content))

    return spoil


REFERENCE_FAULTS: list[tuple[str, Change, str]] = [
    ("missing", lambda m: m.pop("molar_mass_kg_per_mol"), "molar_mass_kg_per_mol: is missing"),
    ("unknown", lambda m: m.update(colour="blue"), "colour: is not a member that belongs here"),
    ("other id", lambda m: m.update(id="krypton"), "id: is 'krypton', must be 'argon'"),
    ("negative", lambda m: m.update(reducing_density_mol_per_m3=-1.0), "must be above zero"),
    ("wrong R", lambda m: m.update(gas_constant_J_per_mol_K=8.2), "gas_constant_J_per_mol_K: is 8.2, must lie within"),
    ("kind", lambda m: m["residual"][0].update(kind="mystery"), r"residual\[0\]\.kind: is 'mystery', must be one of"),
    ("fields", lambda m: m["residual"][1]["fields"].reverse(), r"residual\[1\]\.fields: must be n, d, t, g, l"),
    ("row", lambda m: m["residual"][1]["terms"][2].pop(), r"residual\[1\]\.terms\[2\]: has 4 numbers, must have 5"),
    ("text", lambda m: m["residual"][0]["terms"][0].__setitem__(0, "0.1"), r"terms\[0\]: must be a number"),
    ("gap", lambda m: m["saturation"]["pieces"].pop(1), r"saturation\.pieces: must rise from 0 and join"),
    ("range", lambda m: m["validity"].update(temperature_min_K=9e9), "must lie below temperature_max_K"),
    ("extended", lambda m: m["extended"].update(pressure_max_Pa=1.0), "extended: must hold the range of validity"),
    ("open", lambda m: m["density_uncertainty"].pop(), "must end with an entry that holds for every state"),
    ("basis", lambda m: m["density_uncertainty"][0].update(basis="hearsay"), "is 'hearsay', must be one of"),
    ("year", lambda m: m["citation"].update(year="1999"), r"citation\.year: must be a whole number"),
    ("class", lambda m: m.update(equation_class="best"), "equation_class: is 'best', must be one of"),
]


@pytest.mark.parametrize(
    ("change", "words"), [case[1:] for case in REFERENCE_FAULTS], ids=[case[0] for case in REFERENCE_FAULTS]
)
def test_faulty_reference_file_is_refused(spoiled: Callable[[str, Change], None], change: Change, words: str) -> None:
    """A file that cannot be right is named with the key and what would be right."""
    spoiled("reference/argon.json", change)
    with pytest.raises(DataError, match=words) as caught:
        equation_files._read_reference("argon")
    assert caught.value.file == "reference/argon.json"


GERG_FAULTS: list[tuple[str, Change, str]] = [
    ("pair missing", lambda m: m["pairs"].pop(), "pairs: must hold each of the 210 pairs of components once"),
    ("pair twice", lambda m: m["pairs"].__setitem__(3, copy.deepcopy(m["pairs"][4])), "each of the 210 pairs"),
    ("pair reversed", lambda m: m["pairs"][0].update(i="nitrogen", j="methane"), "each of the 210 pairs"),
    ("unknown component", lambda m: m["pairs"][0].update(i="neon"), r"pairs\[0\]\.i: is 'neon', must be one of"),
    ("unknown departure", lambda m: m["pairs"][0].update(departure="x"), r"pairs\[0\]\.departure: is 'x'"),
    ("departure without factor", lambda m: m["pairs"][0].update(factor=0), "must be null where the factor is 0"),
    ("component twice", lambda m: m["components"].append(m["components"][0]), "must name each component once"),
    ("unknown member", lambda m: m["departures"][0].update(x=1), r"departures\[0\]\.x: is not a member"),
]


@pytest.mark.parametrize(("change", "words"), [case[1:] for case in GERG_FAULTS], ids=[case[0] for case in GERG_FAULTS])
def test_faulty_gerg_file_is_refused(spoiled: Callable[[str, Change], None], change: Change, words: str) -> None:
    """The file of GERG-2008 is complete and consistent, or refused."""
    spoiled("gerg_2008.json", change)
    with pytest.raises(DataError, match=words):
        equation_files._read_gerg()


def test_broken_and_missing_files_are_named(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """No JSON, and no file, are faults of that file and not a traceback of the parser."""
    monkeypatch.setattr(data_files, "_DATA", tmp_path)
    shutil.copytree(Path(equation_files.__file__).parent / "data" / "reference", tmp_path / "reference")
    (tmp_path / "reference" / "argon.json").write_text('{"id": ')
    with pytest.raises(DataError, match=r"reference/argon\.json: is not JSON"):
        equation_files._read_reference("argon")
    with pytest.raises(DataError, match=r"gerg_2008\.json: the file is missing from the package"):
        equation_files._read_gerg()
