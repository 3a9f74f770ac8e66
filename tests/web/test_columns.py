"""Columns of numbers: one strict pass, whatever comes."""

from __future__ import annotations

import math

import numpy as np
import pytest
from marshmallow import ValidationError

from gasapi.web.columns import Column, FractionColumns, SeriesGas, StatusColumn, Timestamps, stacked


def test_numbers_and_nulls_become_an_array():
    """NaN stands for null, whole numbers are numbers."""
    found = Column().reader([1, 2.5, None, -0.0, 2**60 + 1])
    assert found.dtype == np.float64
    assert np.array_equal(found, [1.0, 2.5, math.nan, -0.0, float(2**60 + 1)], equal_nan=True)


def test_one_number_stays_one():
    """As a float, whole or not."""
    assert Column().reader(3) == 3.0
    assert type(Column().reader(3)) is float


@pytest.mark.parametrize("value", [True, "1", {}, [True], ["1"], [[1.0]], [{}], [], [1.0, False], [1.0, None, "x"]])
def test_anything_else_is_refused(value):
    """Booleans and text above all, which NumPy would take for numbers."""
    with pytest.raises(ValidationError):
        Column().reader(value)


def test_the_first_wrong_elements_are_named():
    """Twenty of a hundred thousand."""
    with pytest.raises(ValidationError) as caught:
        Column().reader([1.0, "x"] * 50_000)
    assert list(caught.value.messages) == [2 * i + 1 for i in range(20)]


def test_numbers_beyond_a_double_are_refused():
    """Where they stand."""
    with pytest.raises(ValidationError) as caught:
        Column().reader([1.0, 10**400])
    assert list(caught.value.messages) == [1]


@pytest.mark.parametrize(("value", "wrong"), [([0, 2**32 - 1, None], None), ([0, 2**32], [1]), ([0.5], [0]), ([-1, 0], [0])])
def test_status_codes(value, wrong):
    """Whole numbers of 32 bits and null."""
    if wrong is None:
        assert len(StatusColumn().reader(value)) == len(value)
        return
    with pytest.raises(ValidationError) as caught:
        StatusColumn().reader(value)
    assert list(caught.value.messages) == wrong


def test_timestamps_are_left_alone():
    """The very list."""
    value = ["a", 1, 0.5, None]
    assert Timestamps().reader(value) is value
    with pytest.raises(ValidationError):
        Timestamps().reader([["a"]])


def test_a_gas_that_changes_by_the_row():
    """Arrays and numbers beside each other, divided by their unit."""
    found = SeriesGas().reader({"fractions": {"methane": [90, None], "nitrogen": 10}, "fraction_unit": "%"})
    assert isinstance(found, FractionColumns)
    assert found.names == ("methane", "nitrogen")
    assert np.array_equal(stacked(found.columns, 2), [[0.9, 0.1], [math.nan, 0.1]], equal_nan=True)


def test_a_gas_that_does_not_change_is_that_of_a_state():
    """A name or numbers."""
    assert SeriesGas().reader("argon").name == "argon"
    assert SeriesGas().reader({"fractions": {"argon": 1}}).fractions == (("argon", 1.0),)


@pytest.mark.parametrize(
    ("gas", "where"),
    [
        ({"fractions": {"methane": [1, "x"], "nitrogen": -1}}, {"fractions": {"methane", "nitrogen"}}),
        ({"fractions": {"methane": [1]}, "basis": "volume"}, {"basis"}),
        ({"fractions": {"methane": [1]}, "fraction_unit": "promille"}, {"fraction_unit"}),
        ({"fractions": {"methane": [1], "": 0}}, {"fractions"}),
        ({"fractions": {"methane": [1]}, "foo": 1}, {"foo"}),
    ],
)
def test_all_faults_of_a_gas_are_told(gas, where):
    """At once."""
    with pytest.raises(ValidationError) as caught:
        SeriesGas().reader(gas)
    assert set(where) == set(caught.value.messages)
    if isinstance(where, dict):
        assert where["fractions"] == set(caught.value.messages["fractions"])
