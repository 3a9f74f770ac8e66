"""The data files as files: the hash that names them, and the check values beside them."""

from __future__ import annotations

import hashlib
import re
from pathlib import Path
from typing import Any

import orjson
import pytest

from gasapi.gases import data_files, loader
from gasapi.gases.data_files import data_hash, hash_of_files
from gasapi.gases.equation_files import load_gerg, load_reference, reference_ids

PUBLISHED = Path(__file__).parents[1] / "engine" / "published"


def test_every_data_file_enters_the_hash() -> None:
    """Five lists and eighty equations, in the order of their names."""
    names = [name for name, _ in data_files.data_files()]
    assert sorted(names) == names
    assert {f"data/reference/{id}.json" for id in reference_ids()} == {name for name in names if "reference/" in name}
    assert {"data/gerg_2008.json", "data/substances.json", "data/interaction.json", "data/blends.json"} < set(names)
    assert "data/generalised_uncertainty.json" in names
    assert len(names) == 85


def test_hash_is_sha256_over_names_and_bytes(tmp_path: Path) -> None:
    """The hash can be made again with nothing but a SHA-256 function."""
    (tmp_path / "b").write_bytes(b"two")
    (tmp_path / "a").write_bytes(b"one")
    expected = hashlib.sha256(b"x\x003\x00oney\x003\x00two").hexdigest()
    assert f"sha256:{expected}" == hash_of_files([("y", tmp_path / "b"), ("x", tmp_path / "a")])


def test_hash_changes_with_one_byte_and_with_a_name(tmp_path: Path) -> None:
    """A changed digit, a moved byte and another name each give another hash; another folder does not."""
    (tmp_path / "a").write_bytes(b"1.0")
    (tmp_path / "b").write_bytes(b"2.0")
    (tmp_path / "same").write_bytes(b"1.0")
    first = hash_of_files([("n", tmp_path / "a")])
    assert first == hash_of_files([("n", tmp_path / "same")])
    assert len({first, hash_of_files([("n", tmp_path / "b")]), hash_of_files([("m", tmp_path / "a")])}) == 3


def test_data_hash_is_that_of_all_files() -> None:
    """The hash of the data has the form that answers carry, and is the same each time."""
    assert re.fullmatch("sha256:[0-9a-f]{64}", data_hash())
    assert data_hash() == hash_of_files(reversed(data_files.data_files()))


def test_keys_carry_units_and_numbers_are_finite() -> None:
    """No data file holds a number that JSON cannot, and one record stands on one line."""
    for _, path in data_files.data_files():
        content = path.read_bytes()
        orjson.loads(content)
        assert content.endswith(b"}\n")
        assert max(map(len, content.splitlines())) < 2000


def test_loader_offers_what_the_rest_of_the_program_needs() -> None:
    """The public face names everything that it lists."""
    assert all(callable(getattr(loader, name)) for name in loader.__all__)
    assert sorted(loader.__all__) == loader.__all__


def published(name: str) -> dict[str, Any]:
    content: dict[str, Any] = orjson.loads((PUBLISHED / name).read_bytes())
    return content


@pytest.mark.parametrize("section", ["published", "states", "saturation", "boiling"])
def test_check_values_of_reference_equations_are_well_formed(section: str) -> None:
    """Every check value is of a known equation, lies within its range, and holds positive numbers."""
    rows = published("reference_check_points.json")[section]
    assert len(rows) > 40
    for row in rows:
        equation = load_reference(row["id"])
        assert equation.validity.temperature_min - 0.01 <= row["temperature_K"] <= equation.extended.temperature_max
        assert all(value > 0.0 for value in row.values() if isinstance(value, int | float))


def test_every_reference_equation_has_check_values() -> None:
    """Each equation is checked at three states at least, and each but air's on its saturation curve."""
    content = published("reference_check_points.json")
    for id in reference_ids():
        assert sum(row["id"] == id for row in content["states"]) >= 3
        assert (id != "air") == any(row["id"] == id for row in content["saturation"])


def test_compressibility_factors_fit_their_states() -> None:
    """p = Z rho R T with the R of the equation: the columns of a check value belong together."""
    for row in published("reference_check_points.json")["states"]:
        expected = (
            row["compressibility_factor"]
            * row["density_mol_per_m3"]
            * load_reference(row["id"]).gas_constant
            * row["temperature_K"]
        )
        assert row["pressure_Pa"] == pytest.approx(expected, rel=1e-10)


def test_check_values_of_gerg_are_well_formed() -> None:
    """Fractions are of components and sum to 1; p = Z rho R T with the R of the equation."""
    components = {component.id for component in load_gerg().components}
    rows = published("gerg_2008_check_points.json")["points"]
    assert len(rows) == 25
    for row in rows:
        assert components >= set(row["fractions"])
        assert pytest.approx(sum(row["fractions"].values()), abs=1e-12) == 1.0
        expected = row["compressibility_factor"] * row["density_mol_per_m3"] * 8.314472 * row["temperature_K"]
        assert row["pressure_Pa"] == pytest.approx(expected, rel=1e-10)


def test_water_check_values_are_those_of_the_release() -> None:
    """IAPWS R6-95, table 7: at 500 K and 4.532 kg/m3 the pressure is 0.999938125 MPa; eleven states are printed, nine held."""
    rows = [row for row in published("reference_check_points.json")["published"] if row["id"] == "water"]
    found = {(row["temperature_K"], row["density_kg_per_m3"]): row["pressure_Pa"] for row in rows}
    assert found[500, 4.532] == 999938.125
    assert found[300, 1188.202] == 700004704
