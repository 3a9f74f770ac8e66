"""The named reference conditions against the contract's and the standards' figures."""

from gasapi.units import REFERENCE_CONDITIONS


def test_figures():
    """DIN 1343, ISO 13443, IUPAC (1982) and two conventions of the trade, in K and Pa."""
    figures = {key: (c.temperature, c.pressure) for key, c in REFERENCE_CONDITIONS.items()}
    assert figures == {
        "din-1343": (273.15, 101325.0),
        "iso-13443": (288.15, 101325.0),
        "60F-14.696psi": (288.7056, 101325.0),
        "20C-101.325kPa": (293.15, 101325.0),
        "iupac-stp": (273.15, 100000.0),
    }


def test_each_has_a_name_and_a_source():
    """A condition without its source would be a rumour."""
    assert all(c.name and c.source for c in REFERENCE_CONDITIONS.values())
