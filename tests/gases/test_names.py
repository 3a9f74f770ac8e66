"""Folding of names, and the nearest ones."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gasapi.gases.names import NearestNames, folded, loose


@pytest.mark.parametrize(
    ("typed", "expected"),
    [
        (" Carbon  Dioxide ", "carbon dioxide"),
        ("CO₂", "co2"),
        ("\uff23\uff28\uff14", "ch4"),
        ("\tn-BUTANE\n", "n-butane"),
        ("", ""),
    ],
)
def test_folded_forgets_case_blanks_and_lowered_digits(typed: str, expected: str) -> None:
    """A name is the same name however its letters are set."""
    assert expected == folded(typed)


@pytest.mark.parametrize(
    ("typed", "expected"),
    [("R-134a", "r134a"), ("R 134A", "r134a"), ("2,2-dimethyl_butane", "22dimethylbutane"), ("R-1233zd(E)", "r1233zd(e)")],
)
def test_loose_forgets_hyphens_and_commas_too(typed: str, expected: str) -> None:
    """Refrigerant numbers and systematic names are written with and without marks; brackets tell isomers apart and stay."""
    assert expected == loose(typed)


@given(st.text(alphabet=st.characters(max_codepoint=126), max_size=200))
def test_folding_twice_changes_nothing(text: str) -> None:
    """A folded name is already folded, whatever plain text it came from."""
    assert folded(text) == folded(folded(text))
    assert loose(text) == loose(loose(text))


KNOWN = NearestNames((name, name) for name in ("nitrogen", "nitrogen-dioxide", "hydrogen", "oxygen", "methane", "ethane"))


@pytest.mark.parametrize(
    ("typed", "expected"),
    [("nitrogn", "nitrogen"), ("Nitorgen", "nitrogen"), ("methan", "methane"), ("oxigen", "oxygen"), ("hydrogn", "hydrogen")],
)
def test_nearest_comes_first(typed: str, expected: str) -> None:
    """A slip of the finger finds the name that was meant."""
    assert expected == KNOWN.of(typed)[0]


@pytest.mark.parametrize("typed", ["", "zzz", "💨", "1234567890" * 1000])
def test_nothing_is_near_to_nonsense(typed: str) -> None:
    """Where nothing resembles the text, nothing is suggested, however long it is."""
    assert KNOWN.of(typed) == ()


def test_each_answer_comes_once_and_no_more_than_asked() -> None:
    """Several names of one gas give one suggestion."""
    names = NearestNames([("butane", "n-butane"), ("n-butane", "n-butane"), ("isobutane", "isobutane")])
    assert names.of("butan") == ("n-butane", "isobutane")
    assert names.of("butan", count=1) == ("n-butane",)


@given(st.text(max_size=300))
def test_any_text_is_answered(text: str) -> None:
    """No text makes the search fail, and the same text gives the same answer."""
    found = KNOWN.of(text)
    assert len(found) <= 5
    assert found == KNOWN.of(text)
