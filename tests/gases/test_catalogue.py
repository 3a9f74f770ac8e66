"""Finding a gas by any of its names."""

from __future__ import annotations

import time
from concurrent.futures import ThreadPoolExecutor
from dataclasses import replace

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gasapi.errors import UnknownGas
from gasapi.gases.catalogue import AmbiguousName, Catalogue
from gasapi.gases.equation_files import _read_gerg, _read_reference, load_gerg, load_reference, reference_ids
from gasapi.gases.interaction_file import _read_interaction
from gasapi.gases.reading import DataError
from gasapi.gases.substance_files import _read_blends, _read_substances

CATALOGUE = Catalogue.load()
NAMES = [(name, gas.id) for gas in CATALOGUE.gases for name in (gas.id, gas.name, *gas.synonyms)]


def test_every_name_finds_its_gas() -> None:
    """Ids, names and synonyms of all gases lead to the gas that bears them."""
    assert [id for _, id in NAMES] == [CATALOGUE.find(name).id for name, _ in NAMES]


@given(st.sampled_from(NAMES), st.sampled_from([str.upper, str.lower, str.title]), st.sampled_from(["", " ", "\t", "  "]))
def test_case_and_blanks_do_not_matter(named: tuple[str, str], change: object, blanks: str) -> None:
    """A name in any case, with blanks around it, is the same name."""
    assert callable(change)
    assert named[1] == CATALOGUE.find(f"{blanks}{change(named[0])}{blanks}").id


@pytest.mark.parametrize("gas", CATALOGUE.gases, ids=lambda gas: gas.id)
def test_cas_number_finds_its_gas(gas: object) -> None:
    """A CAS number means one substance; the number that hydrogen and parahydrogen share means hydrogen."""
    assert hasattr(gas, "cas")
    if gas.cas is not None:
        assert ("hydrogen" if gas.id == "parahydrogen" else gas.id) == CATALOGUE.find(gas.cas).id  # type: ignore[attr-defined]


# systematic names of the 2013 recommendations of IUPAC, or the names that they keep
@pytest.mark.parametrize(
    ("systematic", "id"),
    [
        ("ethene", "ethylene"),
        ("propene", "propylene"),
        ("ethyne", "acetylene"),
        ("2-methylpropane", "isobutane"),
        ("2-methylbutane", "isopentane"),
        ("2,2-dimethylpropane", "neopentane"),
        ("2-methylpentane", "2-methylpentane"),
        ("2,2,4-trimethylpentane", "isooctane"),
        ("oxirane", "ethylene-oxide"),
        ("methoxymethane", "dimethyl-ether"),
        ("chloroethene", "vinyl-chloride"),
        ("phosphane", "phosphine"),
        ("dinitrogen monoxide", "nitrous-oxide"),
        ("deuterium oxide", "heavy-water"),
        ("1,1,1,2-tetrafluoroethane", "r134a"),
        ("tetrafluoromethane", "r14"),
        ("chloromethane", "methyl-chloride"),
        ("tetrachloromethane", "carbon-tetrachloride"),
    ],
)
def test_systematic_names(systematic: str, id: str) -> None:
    """A chemist's name finds the gas as well as that of the trade."""
    assert id == CATALOGUE.find(systematic).id


@pytest.mark.parametrize(
    ("typed", "id"),
    [
        ("N2", "nitrogen"),
        ("n2", "nitrogen"),
        ("CO₂", "carbon-dioxide"),
        ("C2H6", "ethane"),
        ("C3H8", "propane"),
        ("H2", "hydrogen"),
        ("p-H2", "parahydrogen"),
        ("SF6", "sulfur-hexafluoride"),
        ("CO", "carbon-monoxide"),
        ("R-744", "carbon-dioxide"),
        ("r744", "carbon-dioxide"),
        ("R 290", "propane"),
        ("R134A", "r134a"),
        ("isohexane", "2-methylpentane"),
        ("hydrogen sulphide", "hydrogen-sulfide"),
        ("dry air", "air"),
        ("Forming gas 95/5", "forming-gas-95-5"),
        ("syngas", "synthesis-gas"),
    ],
)
def test_formulas_and_names_of_the_trade(typed: str, id: str) -> None:
    """Formulas that mean one gas, refrigerant numbers and trade names are found."""
    assert id == CATALOGUE.find(typed).id


@pytest.mark.parametrize(
    ("formula", "candidates"),
    [("C4H10", ("n-butane", "isobutane")), ("c3h6", ("cyclopropane", "propylene")), ("C2H6O", ("ethanol", "dimethyl-ether"))],
)
def test_shared_formula_asks_back(formula: str, candidates: tuple[str, ...]) -> None:
    """A formula of several isomers is not guessed: the answer lists them."""
    with pytest.raises(AmbiguousName, match=r"may mean .*; name one of them") as caught:
        CATALOGUE.find(formula)
    assert (formula, candidates) == (caught.value.name, caught.value.nearest)


@pytest.mark.parametrize(
    ("typed", "nearest"),
    [("nitrogn", "nitrogen"), ("metane", "methane"), ("sulfer dioxide", "sulfur-dioxide"), ("clorine", "chlorine")],
)
def test_unknown_name_carries_the_nearest(typed: str, nearest: str) -> None:
    """A slip is answered with what was probably meant, first."""
    with pytest.raises(UnknownGas, match=f"no gas is called '{typed}' here; nearest names: {nearest}") as caught:
        CATALOGUE.find(typed)
    assert (typed, nearest) == (caught.value.name, caught.value.nearest[0])


def test_one_missing_letter_is_recognised() -> None:
    """Of all ids with seven letters or more, one letter taken from the middle, 98 in 100 are among the suggestions."""
    ids = [gas.id for gas in CATALOGUE.gases if len(gas.id) >= 7]
    missed = [id for id in ids if id not in CATALOGUE.nearest(id[: len(id) // 2] + id[len(id) // 2 + 1 :])]
    assert len(missed) <= 0.02 * len(ids), missed


@pytest.mark.parametrize("name", ["", " ", "phlogiston", "natural gas main component", "../../etc/passwd", "\x00", "💨"])
def test_names_that_mean_nothing_are_unknown(name: str) -> None:
    """What no gas is called is unknown, never a nearest guess."""
    with pytest.raises(UnknownGas):
        CATALOGUE.find(name)


def test_very_long_name_is_refused_briefly() -> None:
    """A name of a million letters costs nothing and is not sent back."""
    with pytest.raises(UnknownGas) as caught:
        CATALOGUE.find("n" * 1_000_000)
    assert len(str(caught.value)) < 200


@given(st.text(max_size=150))
def test_any_text_is_a_gas_or_unknown(text: str) -> None:
    """No text makes the search fail in another way."""
    try:
        found = CATALOGUE.find(text)
    except UnknownGas:
        return
    assert found in CATALOGUE.gases


def test_gas_and_substance_by_id() -> None:
    """An id finds gas and constants; a blend has no constants of its own, and a synonym is no id."""
    assert CATALOGUE.substance("methane").critical_temperature == 190.564
    assert CATALOGUE.gas("air").kind == "blend"
    for id in ("air", "N2", "nothing"):
        with pytest.raises(UnknownGas):
            CATALOGUE.substance(id)


def test_search_ranks_exact_then_beginning_then_within() -> None:
    """An exact name comes first, then names that begin with the text, then names that hold it."""
    found = [gas.id for gas in CATALOGUE.search("hydrogen")]
    assert found[0] == "hydrogen"
    assert found.index("hydrogen-sulfide") < found.index("natural-gas-hydrogen-20")
    assert "parahydrogen" in found
    assert {"n-butane", "isobutane"} == {gas.id for gas in CATALOGUE.search("C4H10")[:2]}
    assert CATALOGUE.search("74-82-8")[0].id == "methane"


def test_search_without_text_lists_all_and_a_slip_finds_the_nearest() -> None:
    """An empty search is the whole list; a typing error is forgiven."""
    assert CATALOGUE.gases == CATALOGUE.search(" ")
    assert CATALOGUE.search("nitrogn")[0].id == "nitrogen"
    assert CATALOGUE.search("qqqqqq") == ()


def test_every_reference_equation_belongs_to_a_gas() -> None:
    """All 80 equations are reached; 2-methylpentane has that of isohexane, compressed air that of air."""
    found = {CATALOGUE.reference_id(gas.id) for gas in CATALOGUE.gases} - {None}
    assert set(reference_ids()) == found
    assert CATALOGUE.reference_id("2-methylpentane") == "isohexane"
    assert (CATALOGUE.reference_id("air"), CATALOGUE.reference_id("compressed-air")) == ("air", "air")
    assert (CATALOGUE.reference_id("synthetic-air-80-20"), CATALOGUE.reference_id("cyanogen")) == (None, None)


def test_reference_equation_describes_the_same_substance() -> None:
    """Molar mass and critical temperature of gas and equation agree, so that no equation is given to the wrong gas."""
    for gas in CATALOGUE.gases:
        id = CATALOGUE.reference_id(gas.id)
        if id is None or gas.substance is None:
            continue
        equation = load_reference(id)
        assert equation.molar_mass == pytest.approx(gas.substance.molar_mass, rel=2e-4)
        assert equation.critical_published.temperature == pytest.approx(gas.substance.critical_temperature, rel=7e-3)


def test_gerg_components_are_gases_of_the_catalogue() -> None:
    """All 21 components are found by their id, and no other gas is one."""
    ids = {component.id for component in load_gerg().components}
    assert ids == {gas.id for gas in CATALOGUE.gases if CATALOGUE.gerg_component(gas.id)}
    for component in load_gerg().components:
        assert component.molar_mass == pytest.approx(CATALOGUE.substance(component.id).molar_mass, rel=2e-4)


def test_components_of_pure_gases_and_blends() -> None:
    """A pure gas is made of itself."""
    assert CATALOGUE.components(CATALOGUE.gas("argon")) == (("argon", 1.0),)
    assert CATALOGUE.gas("air").blend == CATALOGUE.components(CATALOGUE.gas("air"))


def test_two_gases_cannot_share_a_name() -> None:
    """A name that belongs to another gas is refused when the catalogue is built, with or without hyphens."""
    argon = CATALOGUE.gas("argon")
    for name in ("Nitrogen", "R728", "dinitrogen"):
        twin = replace(argon, id="twin", cas=None, formula=None, name="Twin", synonyms=(name,))
        with pytest.raises(DataError, match=f"the name '{name}' belongs to nitrogen already"):
            Catalogue((*CATALOGUE.gases, twin))


def test_no_name_is_the_formula_of_another_gas() -> None:
    """A short name such as EO or PO never hides a formula."""
    formulas = {gas.formula.casefold(): gas.id for gas in CATALOGUE.gases if gas.formula is not None}
    clashes = [(name, id) for name, id in NAMES if formulas.get(name.casefold(), id) != id]
    assert clashes == []


def test_catalogue_answers_many_threads_alike() -> None:
    """Threads that share a catalogue get the same gases and cautions as one alone."""
    catalogue = Catalogue.load()

    def ask(named: tuple[str, str]) -> tuple[str, tuple[str, ...]]:
        gas = catalogue.find(named[0].upper())
        return gas.id, catalogue.cautions(catalogue.components(gas))

    with ThreadPoolExecutor(8) as threads:
        found = list(threads.map(ask, NAMES * 3))
    alone = [(id, CATALOGUE.cautions(CATALOGUE.components(CATALOGUE.gas(id)))) for _, id in NAMES]
    assert alone * 3 == found


def test_the_whole_data_loads_quickly() -> None:
    """All files, every equation included, are read and checked in well under a second of processor time."""
    costs = []
    for _ in range(3):
        begun = time.process_time()
        gases = (*_read_substances(), *_read_blends())
        _read_gerg()
        _read_interaction()
        for id in reference_ids():
            _read_reference(id)
        Catalogue(gases)
        costs.append(time.process_time() - begun)
    assert min(costs) < 0.6


def test_known_name_costs_about_a_dictionary_look() -> None:
    """A name in its usual spelling is found in well under ten microseconds of processor time."""
    costs = []
    for _ in range(5):
        begun = time.process_time()
        for _ in range(2000):
            CATALOGUE.find("Carbon dioxide")
        costs.append((time.process_time() - begun) / 2000)
    assert min(costs) < 5e-6
