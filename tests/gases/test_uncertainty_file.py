"""The file of measured uncertainties."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import orjson
import pytest

from gasapi.gases import data_files, uncertainty_file
from gasapi.gases.catalogue import Catalogue
from gasapi.gases.reading import DataError
from gasapi.gases.uncertainty_file import CLASSES, load_generalised_uncertainty
from gasapi.service.models import GENERALISED

NAME = "generalised_uncertainty.json"
PATH = dict(data_files.data_files())[f"data/{NAME}"]


def test_every_generalised_equation_has_its_tables() -> None:
    """One entry for each equation, a table for each class, and a liquid where the equation has one."""
    data = load_generalised_uncertainty()
    assert set(GENERALISED) == set(data.models)
    for model, tables in data.models.items():
        assert set(CLASSES) == set(tables.gas)
        assert (set() if GENERALISED[model].gas_only else set(CLASSES)) == set(tables.liquid)
        assert GENERALISED[model].uses_interaction == (tables.missing_interaction is not None)


def test_hydrogen_bonding_molecules_are_in_the_catalogue() -> None:
    """Every id of the list is that of a pure gas, and holds hydrogen with nitrogen, oxygen, fluorine or, in HCN, carbon."""
    catalogue = Catalogue.load()
    for id in load_generalised_uncertainty().hydrogen_bonding:
        formula = catalogue.gas(id).formula
        assert formula is not None
        assert any(letter in formula for letter in "HD")
        assert any(letter in formula for letter in "NOF")


def _no_models(content: dict[str, Any]) -> None:
    del content["models"]


def _short_row(content: dict[str, Any]) -> None:
    content["models"]["virial"]["gas"]["polar"][3].pop()


def _missing_row(content: dict[str, Any]) -> None:
    content["models"]["virial"]["mixing"].pop()


def _zero(content: dict[str, Any]) -> None:
    content["models"]["virial"]["gas"]["polar"][3][3] = 0.0


def _above_one(content: dict[str, Any]) -> None:
    content["models"]["peng-robinson"]["liquid"]["polar"][0][0] = 1.5


def _falling(content: dict[str, Any]) -> None:
    content["grid"]["temperatures"][4] = 0.1


def _other_temperatures(content: dict[str, Any]) -> None:
    content["grid"]["liquid_temperatures"][0] = 0.35


def _unknown_constant(content: dict[str, Any]) -> None:
    content["models"]["virial"]["constants"].append("dipole")


def _stranger(content: dict[str, Any]) -> None:
    content["surprise"] = 1


@pytest.mark.parametrize(
    ("spoil", "words"),
    [
        (_no_models, "models: is missing"),
        (_short_row, "models.virial.gas.polar[3]: has 19 numbers, must have 20"),
        (_missing_row, "models.virial.mixing: has 24 rows, must have 25"),
        (_zero, "models.virial.gas.polar: must hold numbers above 0 and up to 1"),
        (_above_one, "models.peng-robinson.liquid.polar: must hold numbers above 0 and up to 1"),
        (_falling, "grid.temperatures: must be at least two rising numbers above zero"),
        (_other_temperatures, "grid.liquid_temperatures: must be the temperatures up to 1"),
        (_unknown_constant, "models.virial.constants: holds 'dipole'"),
        (_stranger, "surprise: is not a member that belongs here"),
    ],
)
def test_faults_name_file_and_key(
    spoil: Callable[[dict[str, Any]], None], words: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A spoilt file is refused in words that name the place."""
    content = orjson.loads(PATH.read_bytes())
    spoil(content)
    (tmp_path / NAME).write_bytes(orjson.dumps(content))
    monkeypatch.setattr(data_files, "_DATA", tmp_path)
    with pytest.raises(DataError) as caught:
        uncertainty_file.load_generalised_uncertainty.__wrapped__()
    assert str(caught.value).startswith(f"{NAME}: {words}")
