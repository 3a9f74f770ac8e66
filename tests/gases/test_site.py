"""The site file: what it gives, and every way in which it can be wrong. All compositions are invented."""

from __future__ import annotations

import hashlib
from math import fsum
from pathlib import Path

import pytest

from gasapi.gases.catalogue import Catalogue
from gasapi.gases.reading import DataError
from gasapi.gases.site import Site, load_site

CATALOGUE = Catalogue.load()

GOOD = """
[site]
ambient_pressure = 95000
dew_point_margin = 8

[gases.fuel-gas]
name = "Fuel gas of boiler house 2"
description = "Chromatograph of March"
fractions = { methane = 0.9, C2H6 = 0.06, nitrogen = 0.04 }
synonyms = ["FG"]

[gases.purge]
fractions = { Nitrogen = 99.5, argon = 0.5 }
fraction_unit = "%"

[gases.vent]
fractions = { nitrogen = 0.5, my-solvent = 0.5 }
basis = "mass"

[substances.my-solvent]
name = "Wash oil vapour"
molar_mass = 86.2
critical_temperature = 507.6
critical_pressure = 3025000
acentric_factor = 0.301
hazards = ["flammable"]
"""


def load(tmp_path: Path, text: str) -> Site:
    path = tmp_path / "plant.toml"
    path.write_text(text, encoding="utf-8")
    return load_site(path, CATALOGUE)


def test_good_file_gives_gases_substances_and_settings(tmp_path: Path) -> None:
    """Everything that the file says is there, in its order, with the hash of its bytes."""
    site = load(tmp_path, GOOD)
    assert (site.file, site.ambient_pressure, site.dew_point_margin) == ("plant.toml", 95000.0, 8.0)
    assert [gas.id for gas in site.gases] == ["fuel-gas", "purge", "vent"]
    assert [gas.id for gas in site.substances] == ["my-solvent"]
    assert f"sha256:{hashlib.sha256(GOOD.encode()).hexdigest()}" == site.hash
    fuel = site.gases[0]
    assert (fuel.kind, fuel.name, fuel.description) == ("site", "Fuel gas of boiler house 2", "Chromatograph of March")
    assert fuel.blend == (("methane", 0.9), ("ethane", 0.06), ("nitrogen", 0.04))


def test_catalogue_with_site_finds_both(tmp_path: Path) -> None:
    """Site gases are found by id, name and synonym, beside those of the catalogue, which itself stays as it was."""
    site = load(tmp_path, GOOD)
    both = CATALOGUE.with_site(site)
    for name in ("fuel-gas", "FUEL GAS", "fg", "Fuel gas of boiler house 2"):
        assert both.find(name).id == "fuel-gas"
    assert both.find("N2").id == "nitrogen"
    assert both.substance("my-solvent").critical_temperature == 507.6
    assert len(CATALOGUE.gases) + 4 == len(both.gases)
    assert "fuel-gas" not in {gas.id for gas in CATALOGUE.gases}
    assert any("wash oil vapour (lower limit not held)" in line for line in both.cautions([("my-solvent", 1.0)]))


def test_mass_fractions_become_mole_fractions(tmp_path: Path) -> None:
    """Half and half by mass of 28.014 and 86.2 g/mol is 86.2/(86.2 + 28.014) nitrogen by amount; what was given is kept."""
    vent = load(tmp_path, GOOD).gases[2]
    assert vent.blend is not None
    assert dict(vent.blend) == pytest.approx({"nitrogen": 86.2 / 114.214, "my-solvent": 28.014 / 114.214}, rel=1e-12)
    assert vent.mass_fractions == (("nitrogen", 0.5), ("my-solvent", 0.5))
    # one mole of the mixture weighs the sum
    expected = (86.2 * 28.014 + 28.014 * 86.2) / 114.214
    assert expected == pytest.approx(dict(vent.constants)["molar_mass"].value, rel=1e-12)


def test_percent_and_ppm(tmp_path: Path) -> None:
    """Fractions may come in per cent or parts per million."""
    assert load(tmp_path, GOOD).gases[1].blend == (("nitrogen", 0.995), ("argon", 0.005))
    text = "[gases.span]\nfraction_unit = 'ppm'\nfractions = { nitrogen = 999900, hydrogen-sulfide = 100 }"
    blend = load(tmp_path, text).gases[0].blend
    assert blend is not None
    assert dict(blend) == pytest.approx({"nitrogen": 0.9999, "hydrogen-sulfide": 1e-4}, rel=1e-12)


def test_air_stands_for_its_components(tmp_path: Path) -> None:
    """A blend among the fractions is spread over its components, by amount and by mass, and joins what is there already."""
    text = "[gases.lean]\nfractions = { air = 0.9, nitrogen = 0.1 }"
    blend = load(tmp_path, text).gases[0].blend
    assert blend is not None
    assert dict(blend) == pytest.approx({"nitrogen": 0.9 * 0.7812 + 0.1, "argon": 0.9 * 0.0092, "oxygen": 0.9 * 0.2096})
    by_mass = load(tmp_path, "[gases.pure]\nbasis = 'mass'\nfractions = { air = 1 }").gases[0].blend
    assert by_mass is not None
    assert dict(by_mass) == pytest.approx(dict(CATALOGUE.gas("air").blend or ()), rel=1e-12)


def test_small_rounding_of_the_sum_is_taken_out(tmp_path: Path) -> None:
    """A sum that is off by less than a millionth is scaled to 1; a component of zero is dropped."""
    text = "[gases.mix]\nfractions = { methane = 0.3333333, ethane = 0.3333333, propane = 0.3333333, argon = 0 }"
    blend = load(tmp_path, text).gases[0].blend
    assert blend is not None
    assert [id for id, _ in blend] == ["methane", "ethane", "propane"]
    assert pytest.approx(fsum(x for _, x in blend), abs=1e-15) == 1.0


def test_empty_file_is_a_site_without_wishes(tmp_path: Path) -> None:
    """A file that says nothing leaves everything as it is."""
    site = load(tmp_path, "# nothing yet\n")
    assert (site.gases, site.substances, site.ambient_pressure, site.dew_point_margin) == ((), (), None, None)


SOLVENT = "molar_mass = 86.2\ncritical_temperature = 507.6\ncritical_pressure = 3025000\nacentric_factor = 0.301\n"

FAULTS = [
    ("no toml", "[site", "", "is not TOML"),
    ("key twice", "[site]\nambient_pressure = 95000\nambient_pressure = 96000", "", "is not TOML"),
    ("unknown table", "[sites]\nx = 1", "sites", "is not a member that belongs here; known members: gases, site, substances"),
    ("unknown setting", "[site]\nambient = 95000", "site.ambient", "known members: ambient_pressure, dew_point_margin"),
    ("site no table", "site = 3", "site", "must be a table of named members, not a number"),
    ("ambient in bar", "[site]\nambient_pressure = 0.95", "site.ambient_pressure", "must lie within 40000 and 150000 Pa"),
    ("ambient in mbar", "[site]\nambient_pressure = 950", "site.ambient_pressure", "must lie within 40000 and 150000 Pa"),
    ("ambient as text", "[site]\nambient_pressure = '950 mbar'", "site.ambient_pressure", "must be a number, not a text"),
    ("ambient nan", "[site]\nambient_pressure = nan", "site.ambient_pressure", "must be a finite number"),
    ("margin negative", "[site]\ndew_point_margin = -1", "site.dew_point_margin", "must lie within 0 and 100 K"),
    ("no fractions", "[gases.g]\nname = 'G'", "gases.g.fractions", "is missing"),
    ("fractions empty", "[gases.g]\nfractions = {}", "gases.g.fractions", "sum to 0, must sum to 1"),
    ("sum", "[gases.g]\nfractions = { methane = 0.9, ethane = 0.09 }", "gases.g.fractions", "sum to 0.99, must sum to 1"),
    ("sum just off", "[gases.g]\nfractions = { methane = 0.999998 }", "gases.g.fractions", "sum to 0.999998, must sum to 1"),
    (
        "sum in %",
        "[gases.g]\nfraction_unit='%'\nfractions = { methane = 0.9, ethane = 0.1 }",
        "gases.g.fractions",
        "must sum to 100",
    ),
    ("negative", "[gases.g]\nfractions = { methane = 1.1, ethane = -0.1 }", "gases.g.fractions.ethane", "must lie within 0.0"),
    ("as text", "[gases.g]\nfractions = { methane = '1' }", "gases.g.fractions.methane", "must be a number, not a text"),
    ("unknown gas", "[gases.g]\nfractions = { metane = 1 }", "gases.g.fractions.metane", "nearest names: methane"),
    ("isomers", "[gases.g]\nfractions = { C4H10 = 1 }", "gases.g.fractions.C4H10", "may mean n-butane, isobutane"),
    ("twice", "[gases.g]\nfractions = { N2 = 0.5, nitrogen = 0.5 }", "gases.g.fractions.nitrogen", "which 'N2' names already"),
    ("basis", "[gases.g]\nbasis = 'volume'\nfractions = { methane = 1 }", "gases.g.basis", "must be one of mass, mole"),
    ("unit", "[gases.g]\nfraction_unit = 'percent'\nfractions = { methane = 1 }", "gases.g.fraction_unit", "one of %, 1, ppm"),
    (
        "unknown member",
        "[gases.g]\nfraction = { methane = 1 }\nfractions = { methane = 1 }",
        "gases.g.fraction",
        "is not a member",
    ),
    (
        "bad id",
        '[gases."Fuel Gas"]\nfractions = { methane = 1 }',
        "gases.Fuel Gas",
        "lower-case letters, digits and single hyphens",
    ),
    ("id taken", "[gases.methane]\nfractions = { methane = 1 }", "gases.methane", "belongs to methane already"),
    ("name taken", "[gases.g]\nname = 'Dry air'\nfractions = { methane = 1 }", "gases.g.name", "belongs to air already"),
    (
        "formula taken",
        "[gases.g]\nsynonyms = ['CO2']\nfractions = { methane = 1 }",
        "gases.g.synonyms",
        "to carbon-dioxide already",
    ),
    ("isomer taken", "[gases.g]\nname = 'C4H10'\nfractions = { methane = 1 }", "gases.g.name", "is a formula of the catalogue"),
    (
        "synonyms no list",
        "[gases.g]\nsynonyms = 'FG'\nfractions = { methane = 1 }",
        "gases.g.synonyms",
        "must be a list of texts",
    ),
    (
        "own name twice",
        "[gases.g1]\nname = 'Fuel'\nfractions = { methane = 1 }\n[gases.g2]\nname = 'FUEL'\nfractions = { methane = 1 }",
        "gases.g2.name",
        "belongs to g1 already",
    ),
    (
        "gas of a site gas",
        "[gases.g1]\nfractions = { methane = 1 }\n[gases.g2]\nfractions = { g1 = 1 }",
        "gases.g2.fractions.g1",
        "no gas is called 'g1' here",
    ),
    (
        "mass in kg",
        f"[substances.s]\n{SOLVENT}".replace("86.2", "0.0862"),
        "substances.s.molar_mass",
        "must lie within 1.0 and 1000.0",
    ),
    (
        "pressure in bar",
        f"[substances.s]\n{SOLVENT}".replace("3025000", "30.25"),
        "substances.s.critical_pressure",
        "must lie within",
    ),
    ("omega missing", "[substances.s]\n" + SOLVENT.rsplit("acentric")[0], "substances.s.acentric_factor", "is missing"),
    ("hazard", f"[substances.s]\n{SOLVENT}hazards = ['smelly']", "substances.s.hazards", "known hazards: flammable, toxic"),
    ("substance taken", f"[substances.argon]\n{SOLVENT}", "substances.argon", "belongs to argon already"),
    ("substance no table", "[substances]\ns = 3", "substances.s", "must be a table"),
    ("substance member", f"[substances.s]\n{SOLVENT}boiling = 1", "substances.s.boiling", "is not a member that belongs here"),
]


@pytest.mark.parametrize(("text", "key", "words"), [case[1:] for case in FAULTS], ids=[case[0] for case in FAULTS])
def test_every_fault_names_file_key_and_remedy(tmp_path: Path, text: str, key: str, words: str) -> None:
    """Whatever is wrong is refused at the start, with the place and what would be right."""
    with pytest.raises(DataError) as caught:
        load(tmp_path, text)
    assert ("plant.toml", key) == (caught.value.file, caught.value.key)
    assert words in str(caught.value)
    assert str(tmp_path) not in str(caught.value)


def test_missing_file_and_folder_are_named(tmp_path: Path) -> None:
    """A file that is not there, and a folder in its place, are faults in words."""
    with pytest.raises(DataError, match=r"absent\.toml: cannot be read: No such file"):
        load_site(tmp_path / "absent.toml", CATALOGUE)
    with pytest.raises(DataError, match="cannot be read"):
        load_site(tmp_path, CATALOGUE)


def test_file_that_is_no_text_or_too_large_is_refused(tmp_path: Path) -> None:
    """Bytes that are no UTF-8, and a file beyond all need, are refused."""
    (tmp_path / "a.toml").write_bytes(b"[site]\nx = '\xff'")
    with pytest.raises(DataError, match=r"a\.toml: must be UTF-8 text; byte 12 is not"):
        load_site(tmp_path / "a.toml", CATALOGUE)
    (tmp_path / "b.toml").write_bytes(b"#" * 1_000_001)
    with pytest.raises(DataError, match=r"b\.toml: is larger than 1000000 bytes"):
        load_site(tmp_path / "b.toml", CATALOGUE)
