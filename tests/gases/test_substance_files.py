"""Pure gases and named blends: facts that stand outside this project, and strict reading."""

from __future__ import annotations

import re
from collections.abc import Callable
from math import fsum
from pathlib import Path
from typing import Any

import orjson
import pytest
from CoolProp import CoolProp

from gasapi.gases import data_files, substance_files
from gasapi.gases.equation_files import load_reference
from gasapi.gases.reading import DataError
from gasapi.gases.records import Gas, Hazard, Substance
from gasapi.gases.substance_files import MOLAR_GAS_CONSTANT, load_blends, load_substances, pure_gas

SUBSTANCES = {gas.id: gas for gas in load_substances()}
BLENDS = {gas.id: gas for gas in load_blends()}

# IUPAC, Standard atomic weights of the elements 2021, Pure Appl. Chem. 94 (2022) 573: abridged or conventional values
ATOMIC_WEIGHTS = {
    "H": 1.008, "He": 4.0026, "B": 10.81, "C": 12.011, "N": 14.007, "O": 15.999, "F": 18.998, "Ne": 20.180,
    "Al": 26.982, "Si": 28.085, "P": 30.974, "S": 32.06, "Cl": 35.45, "Ar": 39.95, "Ti": 47.867, "Fe": 55.845,
    "Ni": 58.693, "Ga": 69.723, "Ge": 72.630, "As": 74.922, "Se": 78.971, "Br": 79.904, "Kr": 83.798, "Sn": 118.71,
    "Sb": 121.76, "I": 126.90, "Xe": 131.29, "W": 183.84, "U": 238.03,
    # isotope masses: deuterium (AME2020), radon-222 as the longest-lived
    "D": 2.0141018, "Rn": 222.0,
}  # fmt: skip

PUBLISHED = Path(__file__).parents[1] / "engine" / "published"


def value(gas: Gas, name: str) -> float:
    return dict(gas.constants)[name].value


def test_all_substances_and_blends_are_there() -> None:
    """350 gases and vapours, parahydrogen, and a good dozen blends."""
    assert len(SUBSTANCES) == 351
    assert len(BLENDS) >= 15


@pytest.mark.parametrize("gas", SUBSTANCES.values(), ids=lambda gas: gas.id)
def test_molar_mass_follows_from_the_formula(gas: Gas) -> None:
    """The molar mass is the sum of the standard atomic weights, to their rounding."""
    assert gas.formula is not None
    atoms = re.findall(r"([A-Z][a-z]?)(\d*)", gas.formula)
    assert gas.formula == "".join(symbol + count for symbol, count in atoms)
    expected = fsum(ATOMIC_WEIGHTS[symbol] * int(count or 1) for symbol, count in atoms)
    assert expected == pytest.approx(value(gas, "molar_mass"), rel=4e-5)
    assert gas.substance is not None
    assert expected == pytest.approx(gas.substance.molar_mass * 1000.0, rel=4e-5)


@pytest.mark.parametrize("gas", [*SUBSTANCES.values(), *BLENDS.values()], ids=lambda gas: gas.id)
def test_cas_number_carries_its_check_digit(gas: Gas) -> None:
    """CAS Registry rule: digits weighted by their place from the right sum to the last digit, modulo 10."""
    if gas.cas is None:
        assert gas.kind == "blend"
        return
    match = re.fullmatch(r"(\d{2,7})-(\d{2})-(\d)", gas.cas)
    assert match is not None
    digits = [int(digit) for digit in reversed(match[1] + match[2])]
    assert int(match[3]) == sum(place * digit for place, digit in enumerate(digits, start=1)) % 10


@pytest.mark.parametrize("id", [id for id in SUBSTANCES if re.fullmatch(r"r\d{2,3}[ab]?", id)])
def test_formula_follows_from_the_refrigerant_number(id: str) -> None:
    """ASHRAE 34 numbering: R-(C-1)(H+1)F; what the valences leave over is chlorine."""
    number = int(re.sub(r"\D", "", id))
    carbon, hydrogen, fluorine = number // 100 + 1, number // 10 % 10 - 1, number % 10
    chlorine = 2 * carbon + 2 - hydrogen - fluorine
    formula = SUBSTANCES[id].formula
    assert formula is not None
    atoms = {symbol: int(count or 1) for symbol, count in re.findall(r"([A-Z][a-z]?)(\d*)", formula)}
    expected = {"C": carbon, "H": hydrogen, "F": fluorine, "Cl": chlorine}
    assert {symbol: count for symbol, count in expected.items() if count} == atoms


@pytest.mark.parametrize("gas", [*SUBSTANCES.values(), *BLENDS.values()], ids=lambda gas: gas.id)
def test_inorganic_refrigerant_number_is_the_rounded_molar_mass(gas: Gas) -> None:
    """ASHRAE 34 numbering: inorganic gases are R-7 followed by the molar mass in g/mol; a letter tells twins apart."""
    for synonym in gas.synonyms:
        match = re.fullmatch(r"R-7(\d\d)[a-z]?", synonym, re.IGNORECASE)
        if match is not None:
            # SF6 has more than two digits: R-846 is 700 + 146
            assert int(match[1]) == pytest.approx(value(gas, "molar_mass"), abs=0.6)


# CAS numbers find the same fluids in the independent library
LIBRARY = {
    CoolProp.get_fluid_param_string(name, "CAS"): name
    for name in CoolProp.get_global_param_string("fluids_list").split(",")
    if "Ortho" not in name and "Para" not in name
}
SHARED = [gas for gas in SUBSTANCES.values() if gas.cas in LIBRARY and gas.id not in ("parahydrogen", "deuterium")]


def test_independent_library_knows_many_of_the_gases() -> None:
    """The comparison below covers a hundred gases, so that it cannot pass by comparing none."""
    assert len(SHARED) >= 100


@pytest.mark.parametrize("gas", SHARED, ids=lambda gas: gas.id)
def test_critical_constants_agree_with_an_independent_library(gas: Gas) -> None:
    """Within 0.6 % in Tc, 4 % in pc, 0.02 in the acentric factor of CoolProp's figures.

    The width is that of methyl chloride, R-114 and R-13, for which the library gives the critical point of its fitted
    surface and this catalogue that of the IUPAC review; the gases of the next test are held much closer.
    """
    name = LIBRARY[str(gas.cas)]
    assert value(gas, "critical_temperature") == pytest.approx(CoolProp.PropsSI("Tcrit", name), rel=6e-3)
    assert value(gas, "critical_pressure") == pytest.approx(CoolProp.PropsSI("pcrit", name), rel=4e-2)
    assert value(gas, "acentric_factor") == pytest.approx(CoolProp.PropsSI("acentric", name), abs=0.02)
    assert value(gas, "molar_mass") == pytest.approx(1000.0 * CoolProp.PropsSI("molar_mass", name), rel=2e-4)


COMMON = [
    "methane", "nitrogen", "oxygen", "argon", "carbon-dioxide", "carbon-monoxide", "hydrogen", "helium", "ethane", "propane",
    "n-butane", "ethylene", "water", "ammonia", "hydrogen-sulfide", "sulfur-dioxide", "r134a", "r32",
]  # fmt: skip


@pytest.mark.parametrize("id", COMMON)
def test_constants_of_common_gases_agree_closely(id: str) -> None:
    """Within 0.02 % in Tc, 0.2 % in pc, 0.001 in the acentric factor and 0.05 K in the boiling point of CoolProp's figures."""
    gas = SUBSTANCES[id]
    name = LIBRARY[str(gas.cas)]
    assert value(gas, "critical_temperature") == pytest.approx(CoolProp.PropsSI("Tcrit", name), rel=2e-4)
    assert value(gas, "critical_pressure") == pytest.approx(CoolProp.PropsSI("pcrit", name), rel=2e-3)
    assert value(gas, "acentric_factor") == pytest.approx(CoolProp.PropsSI("acentric", name), abs=1e-3)
    constants = dict(gas.constants)
    if "boiling_temperature" in constants:
        assert constants["boiling_temperature"].value == pytest.approx(
            CoolProp.PropsSI("T", "P", 101325.0, "Q", 0.0, name), abs=0.05
        )


@pytest.mark.parametrize("gas", SUBSTANCES.values(), ids=lambda gas: gas.id)
def test_constants_are_consistent_and_sourced(gas: Gas) -> None:
    """Triple, boiling and critical temperature rise in this order, Z at the critical point is sensible, all is sourced.

    Zc is 0.23 to 0.31 for most gases and 0.12 for hydrogen fluoride; Tb/Tc of normal gases is about 0.6, of helium 0.81
    (common practice, no source).
    """
    constants = dict(gas.constants)
    assert all(constant.source and constant.unit for constant in constants.values())
    critical = constants["critical_temperature"].value
    if "boiling_temperature" in constants:
        assert 0.5 < constants["boiling_temperature"].value / critical < 0.82
    if "triple_temperature" in constants:
        assert constants["triple_temperature"].value < 0.95 * critical
    if "critical_volume" in constants:
        z = constants["critical_pressure"].value * constants["critical_volume"].value / (MOLAR_GAS_CONSTANT * critical)
        assert 0.1 < z < 0.36


def test_parahydrogen_has_the_constants_of_its_equation() -> None:
    """Leachman et al. 2009: Tc 32.938 K, pc 1.2858 MPa; hydrogen's own are 33.145 K and 1.2964 MPa."""
    gas, equation = SUBSTANCES["parahydrogen"], load_reference("parahydrogen")
    assert (value(gas, "critical_temperature"), value(gas, "critical_pressure")) == (32.938, 1.2858e6)
    assert equation.critical_published.temperature == value(gas, "critical_temperature")
    assert (
        value(SUBSTANCES["hydrogen"], "critical_temperature"),
        value(SUBSTANCES["hydrogen"], "critical_pressure"),
    ) == (33.145, 1.2964e6)


HANDBOOK = orjson.loads((PUBLISHED / "van_der_waals_handbook.json").read_bytes())["gases"]


@pytest.mark.parametrize("row", HANDBOOK, ids=lambda row: row["id"])
def test_van_der_waals_constants_agree_with_the_handbook(row: dict[str, Any]) -> None:
    """CRC Handbook, table of van der Waals constants: within 5 %, the handbook's critical points being older."""
    gas = SUBSTANCES[row["id"]]
    assert row["a_Pa_m6_per_mol2"] == pytest.approx(value(gas, "van_der_waals_a"), rel=0.05)
    assert row["b_m3_per_mol"] == pytest.approx(value(gas, "van_der_waals_b"), rel=0.05)


def test_most_van_der_waals_constants_are_close_to_the_handbook() -> None:
    """All but chlorine, neon and furan lie within 3 % of the handbook."""
    outside = {
        row["id"]
        for row in HANDBOOK
        if abs(value(SUBSTANCES[row["id"]], "van_der_waals_a") / row["a_Pa_m6_per_mol2"] - 1.0) > 0.03
        or abs(value(SUBSTANCES[row["id"]], "van_der_waals_b") / row["b_m3_per_mol"] - 1.0) > 0.03
    }
    assert {"chlorine", "neon", "furan"} >= outside


def test_van_der_waals_constants_of_helium_are_far_smaller() -> None:
    """Helium attracts and fills far less than carbon tetrachloride (common practice, no source)."""
    helium, tetrachloride = SUBSTANCES["helium"], SUBSTANCES["carbon-tetrachloride"]
    assert value(tetrachloride, "van_der_waals_a") / value(helium, "van_der_waals_a") > 100.0
    assert value(tetrachloride, "van_der_waals_b") / value(helium, "van_der_waals_b") > 4.0
    assert (
        dict(helium.constants)["van_der_waals_a"].unit,
        dict(helium.constants)["van_der_waals_a"].source,
    ) == ("Pa m6/mol2", "computed from critical constants")


def test_cyanogen_weighs_52() -> None:
    """NCCN: 2 (12.011 + 14.007) = 52.036 g/mol."""
    assert pytest.approx(value(SUBSTANCES["cyanogen"], "molar_mass"), abs=5e-4) == 52.036


@pytest.mark.parametrize("gas", BLENDS.values(), ids=lambda gas: gas.id)
def test_blends_sum_to_one_and_say_where_they_come_from(gas: Gas) -> None:
    """Fractions sum to 1 exactly as decimals do, components are pure gases, and an invented composition is marked."""
    assert gas.blend is not None
    assert pytest.approx(fsum(fraction for _, fraction in gas.blend), abs=1e-15) == 1.0
    assert all(id in SUBSTANCES for id, _ in gas.blend)
    invented = gas.id not in ("air", "compressed-air", "cracked-ammonia")
    assert invented == ("illustrative composition, common practice, no source" in gas.description)


def test_air_has_the_composition_of_its_equation() -> None:
    """Lemmon et al. 2000: N2 0.7812, Ar 0.0092, O2 0.2096; molar mass 28.96546 g/mol (with rounded fractions 0.03 % less)."""
    assert BLENDS["air"].blend == (("nitrogen", 0.7812), ("argon", 0.0092), ("oxygen", 0.2096))
    assert pytest.approx(value(BLENDS["air"], "molar_mass"), rel=3e-4) == 28.96546


def test_quantum_and_associating_gases_are_flagged() -> None:
    """Helium and hydrogen are quantum gases; hydrogen fluoride, carboxylic acids and nitrogen dioxide associate."""
    flags = {id: gas.substance.flags for id, gas in SUBSTANCES.items() if gas.substance is not None}
    assert {"hydrogen", "parahydrogen", "deuterium", "helium"} <= {id for id, found in flags.items() if "quantum" in found}
    associating = {id for id, found in flags.items() if "associating" in found}
    assert {"hydrogen-fluoride", "acetic-acid", "formic-acid", "nitrogen-dioxide", "dinitrogen-tetroxide"} <= associating
    assert not {"nitrogen", "methane", "water"} & associating


def test_entry_of_a_brought_along_substance_has_all_its_constants() -> None:
    """Somebody's own substance gets van der Waals constants and one source, as the catalogue's gases do."""
    substance = Substance("my-solvent", 0.0862, 507.6, 3.025e6, 0.301)
    gas = pure_gas(substance, "My solvent", "the question", kind="site", hazard=Hazard(tags=("flammable",)))
    constants = dict(gas.constants)
    assert ("site", substance, ("flammable",)) == (gas.kind, gas.substance, gas.hazard.tags)
    assert (
        pytest.approx(constants["molar_mass"].value),
        constants["molar_mass"].unit,
        constants["molar_mass"].source,
    ) == (86.2, "g/mol", "the question")
    # at the critical point of a van der Waals gas p = a/(27 b^2) and T = 8 a/(27 R b)
    a, b = constants["van_der_waals_a"].value, constants["van_der_waals_b"].value
    assert pytest.approx(a / (27.0 * b * b)) == 3.025e6
    assert pytest.approx(8.0 * a / (27.0 * MOLAR_GAS_CONSTANT * b)) == 507.6
    assert "critical_volume" not in constants


Change = Callable[[dict[str, Any]], object]


def entry(content: dict[str, Any], id: str) -> dict[str, Any]:
    found: dict[str, Any] = next(item for item in content["substances"] if item["id"] == id)
    return found


@pytest.mark.parametrize(
    ("change", "words"),
    [
        (lambda m: entry(m, "argon").pop("acentric_factor"), r"acentric_factor: is missing"),
        (lambda m: entry(m, "argon").update(odour="none"), r"odour: is not a member that belongs here"),
        (lambda m: entry(m, "argon").update(grade="E"), r"grade: is 'E', must be one of A, B, C, D"),
        (lambda m: entry(m, "argon").update(flags=["heavy"]), r"flags: holds 'heavy', may hold"),
        (lambda m: entry(m, "argon").update(critical_pressure_Pa=[48.63, "huber-2022"]), r"critical_pressure_Pa: is 48\.63"),
        (lambda m: entry(m, "argon").update(critical_pressure_Pa=[4863000, "memory"]), r"names the source 'memory'"),
        (lambda m: entry(m, "argon")["hazard"]["tags"].update(dull="common-practice"), r"dull: is no hazard tag"),
        (lambda m: entry(m, "argon")["hazard"]["tags"].update(toxic="hearsay"), r"toxic: is 'hearsay', must be one of"),
        (
            lambda m: entry(m, "argon")["hazard"].update(lower_flammable_limit=[4.0, "nfpa-497"]),
            r"must lie within 0\.0 and 1\.0",
        ),
        (lambda m: entry(m, "argon").update(id="neon"), r"neon: this id stands here twice"),
    ],
)
def test_faulty_substances_are_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, change: Change, words: str) -> None:
    """A substance that cannot be right is named with the key and what would be right."""
    content = orjson.loads((data_files._DATA / "substances.json").read_bytes())
    change(content)
    (tmp_path / "substances.json").write_bytes(orjson.dumps(content))
    monkeypatch.setattr(data_files, "_DATA", tmp_path)
    with pytest.raises(DataError, match=words):
        substance_files._read_substances()


@pytest.mark.parametrize(
    ("change", "words"),
    [
        (lambda m: m["blends"][0]["fractions"].update(oxygen=0.2095), r"blends\[0\]\.fractions: must sum to 1"),
        (lambda m: m["blends"][0]["fractions"].update(phlogiston=0.1), r"phlogiston: is no id of a pure gas"),
        (lambda m: m["blends"][0].update(source="memory"), r"source: is 'memory', must be one of"),
        (lambda m: m["blends"][0].pop("description"), r"description: is missing"),
        (lambda m: m["blends"][1].update(id="air"), r"air: this id stands here twice"),
    ],
)
def test_faulty_blends_are_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, change: Change, words: str) -> None:
    """A blend that cannot be right is named with the key and what would be right."""
    content = orjson.loads((data_files._DATA / "blends.json").read_bytes())
    change(content)
    (tmp_path / "blends.json").write_bytes(orjson.dumps(content))
    monkeypatch.setattr(data_files, "_DATA", tmp_path)
    with pytest.raises(DataError, match=words):
        substance_files._read_blends()
