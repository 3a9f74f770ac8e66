"""Binary interaction parameters."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import orjson
import pytest

from gasapi.gases import data_files, interaction_file
from gasapi.gases.interaction_file import load_interaction
from gasapi.gases.reading import DataError
from gasapi.gases.records import Substance
from gasapi.gases.substance_files import load_substances

SUBSTANCES: dict[str, Substance] = {gas.id: gas.substance for gas in load_substances() if gas.substance is not None}


def test_every_pair_is_of_two_known_gases_in_order() -> None:
    """3002 pairs, each with its ids in alphabetical order, both in the catalogue."""
    pairs = load_interaction()
    assert len(pairs) == 3002
    assert all(first < second and first in SUBSTANCES and second in SUBSTANCES for first, second in pairs)


@pytest.mark.parametrize(
    ("pair", "expected"),
    [
        # H. Knapp et al. 1982, the values that textbooks reprint for Peng-Robinson (from memory). The list behind this file
        # takes other data sets of the same book, so that the two differ in the third digit
        (("carbon-dioxide", "methane"), 0.0919),
        (("methane", "nitrogen"), 0.0311),
        (("carbon-dioxide", "ethane"), 0.1322),
        (("ethane", "methane"), -0.0026),
        (("carbon-dioxide", "nitrogen"), -0.0170),
    ],
)
def test_well_known_parameters(pair: tuple[str, str], expected: float) -> None:
    """The parameters of common pairs lie within 0.007 of the reprinted ones, and the book is named."""
    found = load_interaction()[pair]
    assert expected == pytest.approx(found.peng_robinson, abs=7e-3)
    assert found.source.startswith("H. Knapp")


def attraction(substance: Substance, temperature: float) -> float:
    """Return d = sqrt(a)/b of Peng-Robinson 1978, sqrt(Pa): the form that the group-contribution rule is written for."""
    w = substance.acentric_factor
    m = 0.37464 + 1.54226 * w - 0.26992 * w**2
    if w > 0.491:
        m = 0.379642 + 1.48503 * w - 0.164423 * w**2 + 0.016666 * w**3
    reduced = temperature / substance.critical_temperature
    alpha = (1.0 + m * (1.0 - reduced**0.5)) ** 2
    rt = 8.314462618 * substance.critical_temperature
    a = 0.45723553 * rt**2 / substance.critical_pressure * alpha
    b = 0.07779607 * rt / substance.critical_pressure
    return float(a**0.5 / b)


def predicted(pair: tuple[str, str], energy: tuple[float, float], temperature: float) -> float:
    """Jaubert and Mutelet 2004, equation 9, for molecules of one group."""
    a, b = energy
    first, second = (attraction(SUBSTANCES[id], temperature) for id in pair)
    between = a * (298.15 / temperature) ** (b / a - 1.0)
    return (between - (first - second) ** 2) / (2.0 * first * second)


LED_BY_THE_RULE = [
    pair for pair, found in load_interaction().items() if found.group_energy is not None and "E-PPR78" in found.source
]


@pytest.mark.parametrize("pair", LED_BY_THE_RULE, ids="/".join)
def test_group_energies_give_the_tabulated_value_at_298_kelvin(pair: tuple[str, str]) -> None:
    """A and B reproduce the tabulated k_ij at 298.15 K to its rounding and that of the constants behind it."""
    found = load_interaction()[pair]
    assert found.group_energy is not None
    assert found.peng_robinson == pytest.approx(predicted(pair, found.group_energy, 298.15), abs=2e-3)


def test_many_pairs_are_led_by_the_rule() -> None:
    """The comparison above covers dozens of pairs."""
    assert len(LED_BY_THE_RULE) > 40


Change = Callable[[dict[str, Any]], object]


@pytest.mark.parametrize(
    ("change", "words"),
    [
        (lambda m: m["pairs"][0].update(first="zinc"), r"pairs\[0\]\.second: must come after first"),
        (lambda m: m["pairs"].insert(0, m["pairs"][5]), r"stands here twice"),
        (lambda m: m["pairs"][0].update(peng_robinson=22.0), r"peng_robinson: is 22\.0, must lie within"),
        (lambda m: m["pairs"][0].update(source="memory"), r"source: is 'memory', must be one of"),
        (lambda m: m["pairs"][0].update(group_energy_Pa=[1.0]), r"group_energy_Pa: has 1 numbers, must have 2"),
        (lambda m: m["pairs"][0].update(comment="x"), r"comment: is not a member"),
    ],
)
def test_faulty_pairs_are_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, change: Change, words: str) -> None:
    """A pair that cannot be right is named with the key and what would be right."""
    content = orjson.loads((data_files._DATA / "interaction.json").read_bytes())
    content["pairs"] = content["pairs"][:10]
    change(content)
    (tmp_path / "interaction.json").write_bytes(orjson.dumps(content))
    monkeypatch.setattr(data_files, "_DATA", tmp_path)
    with pytest.raises(DataError, match=words):
        interaction_file._read_interaction()


def test_parameters_cannot_be_changed() -> None:
    """The table is shared between threads and read-only."""
    with pytest.raises(TypeError):
        load_interaction()[("argon", "neon")] = None  # type: ignore[index]
