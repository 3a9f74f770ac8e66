"""Cautions: nobody is to be told less than the data know, and nobody that silence means safety."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gasapi.gases.catalogue import Catalogue
from gasapi.gases.hazards import GENERAL_CAUTION
from gasapi.gases.records import Gas, Hazard, Substance
from gasapi.gases.substance_files import pure_gas

CATALOGUE = Catalogue.load()
PURE = [gas for gas in CATALOGUE.gases if gas.substance is not None]


def of(**fractions: float) -> str:
    """Return the cautions of a composition as one text; underscores stand for hyphens."""
    return "\n".join(CATALOGUE.cautions((id.replace("_", "-"), x) for id, x in fractions.items()))


def of_gas(id: str) -> str:
    return "\n".join(CATALOGUE.cautions(CATALOGUE.components(CATALOGUE.gas(id))))


# UN Model Regulations on the transport of dangerous goods, division 2.3 or, for liquids, 6.1 (from memory)
@pytest.mark.parametrize(
    "id",
    [
        "ammonia",
        "arsine",
        "boron-trifluoride",
        "boron-trichloride",
        "carbon-monoxide",
        "carbonyl-fluoride",
        "carbonyl-sulfide",
        "chlorine",
        "chlorine-trifluoride",
        "cyanogen",
        "cyanogen-chloride",
        "diborane",
        "dichlorosilane",
        "ethylene-oxide",
        "fluorine",
        "germane",
        "hydrogen-bromide",
        "hydrogen-chloride",
        "hydrogen-cyanide",
        "hydrogen-fluoride",
        "hydrogen-iodide",
        "hydrogen-selenide",
        "hydrogen-sulfide",
        "methanethiol",
        "methyl-bromide",
        "nickel-carbonyl",
        "nitric-oxide",
        "nitrogen-dioxide",
        "nitrosyl-chloride",
        "phosgene",
        "phosphine",
        "phosphorus-pentafluoride",
        "r1216",
        "silicon-tetrafluoride",
        "stibine",
        "sulfur-dioxide",
        "sulfur-tetrafluoride",
        "tungsten-hexafluoride",
    ],
)
def test_toxic_gases_carry_their_caution(id: str) -> None:
    """What the transport rules call toxic is called toxic here."""
    assert "Toxic: " in of_gas(id)


# UN Model Regulations, division 2.1 (from memory)
@pytest.mark.parametrize(
    "id",
    [
        "hydrogen",
        "deuterium",
        "parahydrogen",
        "methane",
        "ethane",
        "propane",
        "n-butane",
        "isobutane",
        "ethylene",
        "propylene",
        "acetylene",
        "dimethyl-ether",
        "vinyl-chloride",
        "methyl-chloride",
        "r32",
        "r143a",
        "r152a",
        "cyclopropane",
        "1-3-butadiene",
        "carbon-monoxide",
        "hydrogen-sulfide",
        "cyanogen",
        "silane",
        "natural-gas-dry",
        "biogas",
        "town-gas",
        "synthesis-gas",
    ],
)
def test_flammable_gases_carry_their_caution(id: str) -> None:
    """What the transport rules call flammable is called flammable here, blends of it too."""
    assert "Flammable: " in of_gas(id)


# UN Model Regulations, subsidiary hazard 5.1 (from memory)
@pytest.mark.parametrize(
    "id",
    ["oxygen", "nitrous-oxide", "fluorine", "chlorine", "nitrogen-trifluoride", "chlorine-trifluoride", "nitrogen-dioxide"],
)
def test_oxidising_gases_carry_their_caution(id: str) -> None:
    """What the transport rules call oxidising is called oxidising here."""
    assert "Oxidising, " in of_gas(id)


# UN Model Regulations, division 2.2 (from memory)
@pytest.mark.parametrize(
    "id", ["nitrogen", "argon", "helium", "neon", "krypton", "xenon", "r14", "r134a", "sulfur-hexafluoride"]
)
def test_inert_gases_suffocate_and_nothing_else(id: str) -> None:
    """An inert gas displaces oxygen; it is not called flammable, toxic or oxidising."""
    cautions = of_gas(id)
    assert "Asphyxiant: displaces oxygen" in cautions
    assert not any(word in cautions for word in ("Toxic", "Flammable", "Oxidising", "Corrosive", "Pyrophoric"))


def test_cyanogen_is_toxic_with_its_limit() -> None:
    """Cyanogen: 10 ppm averaged over a shift (Ontario Regulation 833, after ACGIH), and the example is called one."""
    cautions = of_gas("cyanogen")
    assert "Toxic: cyanogen (exposure limit 10 ppm averaged over a shift)." in cautions
    assert "Exposure limits of Ontario Regulation 833, as an example" in cautions


@pytest.mark.parametrize(
    ("id", "limits"),
    [
        # IEC 60079-20-1:2010 (from memory): volume fractions in air
        ("methane", "from 4.4 % to 17 % in air"),
        ("hydrogen", "from 4 % to 77 % in air"),
        ("propane", "from 1.7 % to 10.9 % in air"),
        ("acetylene", "from 2.3 % to 100 % in air"),
        ("ammonia", "from 15 % to 33.6 % in air"),
        ("carbon-monoxide", "from 10.9 % to 74 % in air"),
    ],
)
def test_flammable_limits_are_quoted(id: str, limits: str) -> None:
    """The caution quotes the limits of the standard and names it."""
    assert limits in of_gas(id)
    assert "IEC 60079-20-1:2010" in of_gas(id)


def test_limit_that_is_not_held_is_said_to_be() -> None:
    """A flammable gas without a figure is still flammable."""
    assert "Flammable: cyanogen (lower limit not held)." in of_gas("cyanogen")


@pytest.mark.parametrize("gas", PURE, ids=lambda gas: gas.id)
def test_every_tag_becomes_a_sentence(gas: Gas) -> None:
    """No tag of a pure gas is lost on the way, and every gas but oxygen suffocates."""
    cautions = of_gas(gas.id)
    words = {
        "toxic": "Toxic: ",
        "flammable": "Flammable: ",
        "corrosive": "Corrosive, ",
        "oxidizer": "Oxidising, ",
        "pyrophoric": "Pyrophoric, ",
        "asphyxiant": "Asphyxiant: ",
    }
    missing = [tag for tag in gas.hazard.tags if words[tag] not in cautions]
    assert missing == []
    assert (gas.id != "oxygen") == ("Asphyxiant: displaces oxygen" in cautions)
    assert ("Toxic: " in cautions) == ("toxic" in gas.hazard.tags)
    assert all(remark in cautions for remark in gas.hazard.remarks)
    assert gas.substance is not None
    assert ("Associates in the vapour" in cautions) == ("associating" in gas.substance.flags)
    assert ("decompose or react by itself" in cautions) == ("decomposes" in gas.substance.flags)
    assert "No hazard data" not in cautions


def test_carcinogens_are_named_by_their_group() -> None:
    """IARC: benzene and formaldehyde group 1, styrene 2A, chloroform 2B."""
    assert "Causes cancer (IARC group 1): benzene; formaldehyde." in of(benzene=0.5, formaldehyde=0.5)
    assert "Probably causes cancer (IARC group 2A): styrene." in of_gas("styrene")
    assert "Possibly causes cancer (IARC group 2B): chloroform." in of_gas("chloroform")


@pytest.mark.parametrize("id", ["air", "compressed-air", "synthetic-air-80-20", "heliox-79-21"])
def test_air_to_breathe_has_no_caution(id: str) -> None:
    """Gases with as much oxygen as air, and nothing else in them, neither suffocate nor feed a fire."""
    assert of_gas(id) == ""


def test_oxygen_enriched_air_feeds_a_fire() -> None:
    """Above 23.5 % of oxygen a gas counts as oxidising (common practice, no source)."""
    assert "Oxidising, " in of_gas("oxygen-enriched-air-32")
    assert "Oxidising, " not in of(nitrogen=0.766, oxygen=0.234)
    assert "Oxidising, " in of(nitrogen=0.764, oxygen=0.236)


def test_too_little_oxygen_suffocates() -> None:
    """Below 19.5 % of oxygen nobody should breathe a gas (common practice, no source)."""
    assert "holds less than the 19.5 % of oxygen" in of(nitrogen=0.806, oxygen=0.194)
    assert "Asphyxiant" not in of(nitrogen=0.804, oxygen=0.196)
    assert "displaces oxygen" in of(nitrogen=0.9995, oxygen=0.0005)


@pytest.mark.parametrize("fraction", [1e-9, 1e-6, 1e-3])
def test_traces_of_toxic_gases_count(fraction: float) -> None:
    """A toxic component is named at any fraction above zero, and not at zero."""
    assert "Toxic: hydrogen sulfide" in of(nitrogen=1.0 - fraction, hydrogen_sulfide=fraction)
    assert "Toxic" not in of(nitrogen=1.0, hydrogen_sulfide=0.0)


def test_breathing_air_with_carbon_monoxide_is_toxic() -> None:
    """Enough oxygen does not hide a poison."""
    cautions = of(nitrogen=0.79, oxygen=0.2095, carbon_monoxide=0.0005)
    assert "Toxic: carbon monoxide" in cautions
    assert "Carbon monoxide has no smell." in cautions
    assert "Asphyxiant" not in cautions


def test_flammability_follows_the_limits_of_the_components() -> None:
    """A quarter of the limit counts: 1.1 % of methane in nitrogen does, 1.0 % does not; two fuels add up (Le Chatelier)."""
    assert "Flammable" in of(nitrogen=0.988, methane=0.012)
    assert "Flammable" not in of(nitrogen=0.99, methane=0.010)
    # 0.6 % of methane and 0.6 % of hydrogen: 0.006/0.044 + 0.006/0.04 = 0.286
    both = of(nitrogen=0.988, methane=0.006, hydrogen=0.006)
    assert "Flammable: methane" in both
    assert "hydrogen (from 4 %" in both


def test_fuel_and_oxidiser_together_are_called_so() -> None:
    """A mixture that may burn in the pipe says so; fuel alone, or fuel with a trace of oxygen, does not."""
    words = "Holds fuel and oxidiser together"
    assert words in of(methane=0.1, nitrogen=0.72, oxygen=0.18)
    assert words in of(hydrogen=0.5, chlorine=0.5)
    assert words in of(propane=0.03, air=0.0, nitrous_oxide=0.97)
    assert words not in of(methane=1.0)
    assert words not in of_gas("biogas")
    assert words not in of(nitrogen=0.78, oxygen=0.22)


def test_carbon_dioxide_is_harmful_by_itself() -> None:
    """Carbon dioxide above its limit is named even where there is oxygen enough; below it is not."""
    words = "Harmful above its exposure limit: carbon dioxide (exposure limit 5000 ppm"
    assert words in of(nitrogen=0.74, oxygen=0.21, carbon_dioxide=0.05)
    assert "Carbon dioxide harms by itself" in of_gas("carbon-dioxide")
    assert "carbon dioxide" not in of(nitrogen=0.79, oxygen=0.2096, carbon_dioxide=0.0004).casefold()


def test_alkanes_are_not_called_harmful() -> None:
    """The limit of 1000 ppm of methane, ethane and propane is that of gases that suffocate; the caution names that instead."""
    assert "Harmful" not in of(methane=0.9, ethane=0.07, propane=0.03)


def test_substance_without_hazard_data_is_not_called_safe() -> None:
    """An own substance of a question is unknown, and unknown is not safe, at any fraction."""
    assert "No hazard data are held for my-solvent: not known is not safe." in of(nitrogen=0.999999, my_solvent=1e-6)


def test_own_substance_is_not_taken_for_a_gas_of_the_same_id() -> None:
    """Somebody's own "oxygen" is neither breathable nor known, before and after the same id meant the gas."""
    mixture = [("nitrogen", 0.79), ("oxygen", 0.21)]
    for _ in range(2):
        assert CATALOGUE.cautions(mixture) == ()
        cautions = CATALOGUE.cautions(mixture, {"oxygen"})
        assert any("No hazard data are held for oxygen" in line for line in cautions)
        assert any("displaces oxygen" in line for line in cautions)


def test_hazards_of_site_substances_count() -> None:
    """A substance that the catalogue was given with tags is treated as its own gases are, also by its kept name."""
    substance = Substance("nasty", 0.1, 500.0, 4e6, 0.2)
    catalogue = Catalogue((*CATALOGUE.gases, pure_gas(substance, "Nasty", "test", kind="site", hazard=Hazard(tags=("toxic",)))))
    assert "Toxic: nasty (no exposure limit held)." in catalogue.cautions([("nasty", 1e-4), ("nitrogen", 0.9999)])


def test_associating_gas_warns_of_its_density() -> None:
    """Hydrogen fluoride forms hexamers: its density from corresponding states cannot be trusted."""
    assert "density from corresponding states cannot be trusted" in of_gas("hydrogen-fluoride")
    assert "corresponding states" not in of(nitrogen=0.9999, hydrogen_fluoride=0.0001)


def test_water_in_air_is_no_steam_burn() -> None:
    """The remark on steam belongs to steam; moist air is air."""
    assert "Steam burns the skin" in of_gas("water")
    assert of(nitrogen=0.765, oxygen=0.205, argon=0.009, water=0.021) == ""


def test_general_caution_names_what_the_service_is_not_for() -> None:
    """The constant sentence that every answer carries."""
    for word in ("safety instrumented functions", "relief sizing", "custody transfer", "licensed review", "local codes"):
        assert word in GENERAL_CAUTION


def test_tags_of_a_blend_are_those_of_its_components() -> None:
    """A list of gases shows what a blend may do."""
    assert CATALOGUE.hazard_tags(CATALOGUE.gas("biogas")) == ("asphyxiant", "flammable", "oxidizer", "toxic")
    assert CATALOGUE.hazard_tags(CATALOGUE.gas("cyanogen")) == ("flammable", "toxic")


COMPOSITIONS = st.dictionaries(st.sampled_from([gas.id for gas in PURE]), st.floats(1e-6, 1.0), min_size=1, max_size=6)


@given(COMPOSITIONS)
def test_the_same_composition_has_the_same_cautions(weights: dict[str, float]) -> None:
    """Kept sentences are the sentences that a new catalogue writes, and toxic components are never left out."""
    total = sum(weights.values())
    composition = [(id, weight / total) for id, weight in weights.items()]
    first = CATALOGUE.cautions(composition)
    assert first == CATALOGUE.cautions(composition)
    toxic = [id for id in weights if "toxic" in CATALOGUE.gas(id).hazard.tags]
    (named,) = [line for line in first if line.startswith("Toxic: ")] or [""]
    assert bool(toxic) == bool(named)
    assert all(CATALOGUE.gas(id).name.casefold() in named.casefold() for id in toxic)
