"""Strict reading of tables."""

from __future__ import annotations

import math

import pytest

from gasapi.gases.reading import DataError, Table


def table(**members: object) -> Table:
    return Table(members, "plant.toml", "site")


def test_fault_names_file_and_dotted_key() -> None:
    """A fault says where it is, in the words of the file, and keeps its parts as fields."""
    with pytest.raises(DataError) as caught:
        table(pressure="high").number("pressure")
    assert (caught.value.file, caught.value.key) == ("plant.toml", "site.pressure")
    assert str(caught.value) == "plant.toml: site.pressure: must be a number, not a text"


def test_fault_in_nested_table_names_the_way_there() -> None:
    """The key of a nested fault holds all tables that lead to it, and the place in a list."""
    outer = Table({"gases": [{"x": 1.0}, {"x": None}]}, "f.json")
    with pytest.raises(DataError) as caught:
        [item.number("x") for item in outer.tables("gases")]
    assert caught.value.key == "gases[1].x"


def test_member_that_nobody_asked_for_is_refused() -> None:
    """A member left over is a typing error until it is known, and the known ones are listed."""
    read = table(pressure=1.0, presure=2.0)
    assert read.number("pressure") == 1.0
    with pytest.raises(DataError, match=r"site\.presure: is not a member that belongs here; known members: pressure"):
        read.close()


@pytest.mark.parametrize("value", [True, "1", None, [1.0], math.nan, math.inf, -math.inf])
def test_number_takes_finite_numbers_only(value: object) -> None:
    """Truth values, texts, nothing, lists, NaN and infinities are no numbers."""
    with pytest.raises(DataError, match=r"site\.x: must be a (finite )?number"):
        table(x=value).number("x")


@pytest.mark.parametrize(("value", "low", "high"), [(0.999, 1.0, 2.0), (2.001, 1.0, 2.0)])
def test_number_keeps_to_its_range(value: float, low: float, high: float) -> None:
    """A number outside its range is refused with both ends named."""
    with pytest.raises(DataError, match=r"must lie within 1\.0 and 2\.0"):
        table(x=value).number("x", low, high)


def test_number_takes_whole_numbers_and_both_ends() -> None:
    """A whole number becomes a float; the ends of the range belong to it."""
    value = table(x=2).number("x", 2.0, 2.0)
    assert (2.0, float) == (value, type(value))


@pytest.mark.parametrize("value", [0.0, -1.0])
def test_positive_refuses_zero_and_below(value: float) -> None:
    """Zero is not above zero."""
    with pytest.raises(DataError, match="must be above zero"):
        table(x=value).positive("x")


@pytest.mark.parametrize("member", [{}, {"x": None}])
def test_optional_members_may_be_absent_or_null(member: dict[str, None]) -> None:
    """Absent and null are the same for an optional member, and a missing one is named for a required member."""
    assert (
        Table(member, "f").optional_number("x"),
        Table(member, "f").optional_text("x"),
        Table(member, "f").optional_table("x"),
    ) == (None, None, None)
    with pytest.raises(DataError, match="f: x: "):
        Table(member, "f").number("x")


@pytest.mark.parametrize(
    ("value", "words"),
    [
        ([], "list of rows that is not empty"),
        ([[1.0, 2.0], [1.0]], r"rows\[1\]: has 1 numbers, must have 2"),
        ([[1.0, "2"]], r"rows\[0\]: must be a number"),
        ([1.0, 2.0], r"rows\[0\]: must be a list of numbers"),
    ],
)
def test_rows_have_one_width(value: object, words: str) -> None:
    """Rows of numbers are checked one by one."""
    with pytest.raises(DataError, match=words):
        table(rows=value).rows("rows", 2)


def test_choice_lists_what_would_be_right() -> None:
    """A word that is not among the allowed ones is answered with them."""
    with pytest.raises(DataError, match="is 'volume', must be one of mass, mole"):
        table(basis="volume").choice("basis", ("mole", "mass"))


@pytest.mark.parametrize("value", ["", "  ", 3, None, ["a"]])
def test_text_is_not_empty(value: object) -> None:
    """A text of blanks is no text."""
    with pytest.raises(DataError, match="must be a text that is not empty"):
        table(x=value).text("x")


@pytest.mark.parametrize("value", ["text", [""], [1], None])
def test_texts_is_a_list_of_texts(value: object) -> None:
    """One text is not a list of texts."""
    with pytest.raises(DataError, match="must be a list of texts"):
        table(x=value).texts("x")


def test_sourced_number_joins_the_words_of_its_sources() -> None:
    """A value is followed by its source, and by the sources that the first speaks of."""
    sources = {"a": "first", "b": "second", "c": "third"}
    assert table(x=[0.3, "a"]).sourced_number("x", sources) == (0.3, "first")
    assert table(x=[0.3, "a", ["b", "c"]]).sourced_number("x", sources) == (0.3, "first: second; third")


@pytest.mark.parametrize("value", [0.3, [0.3], [0.3, "z"], [0.3, None], [0.3, "a", "z"], [0.3, "a", ["z"]], ["0.3", "a"]])
def test_sourced_number_needs_a_known_source(value: object) -> None:
    """A value without a source that is listed in the file is refused."""
    with pytest.raises(DataError, match=r"site\.x: "):
        table(x=value).sourced_number("x", {"a": "first"})


@pytest.mark.parametrize("value", [1, "true", None])
def test_flag_is_a_truth_value(value: object) -> None:
    """One is not true."""
    with pytest.raises(DataError, match="must be true or false"):
        table(x=value).flag("x")


@pytest.mark.parametrize("value", [2012.0, "2012", True])
def test_whole_is_an_integer(value: object) -> None:
    """A float, a text and a truth value are no whole numbers."""
    with pytest.raises(DataError, match="must be a whole number"):
        table(x=value).whole("x")


@pytest.mark.parametrize("value", [[1.0], {}, None, [[]], "x"])
def test_tables_is_a_list_of_tables(value: object) -> None:
    """A list of tables holds tables, at least one."""
    with pytest.raises(DataError, match=r"site\.x"):
        list(table(x=value).tables("x"))
