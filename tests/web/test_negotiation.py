"""Accept and Content-Type after RFC 9110."""

from __future__ import annotations

import pytest

from gasapi.web.negotiation import CSV, JSON, MediaType, accepted, content_type
from gasapi.web.problems import Problem

OFFERS = (JSON, CSV)


@pytest.mark.parametrize(
    ("accept", "chosen"),
    [
        ("", JSON),
        ("*/*", JSON),
        ("text/*", CSV),
        ("text/csv", CSV),
        ("text/csv;header=absent", CSV),
        ('text/csv; header="absent"', CSV),
        ("text/csv; charset=utf-8; header=absent", CSV),
        ("application/json; charset=utf-8", JSON),
        ("application/json;q=0.1, text/csv;q=0.2", CSV),
        ("*/*;q=0.1, text/csv;q=0", JSON),
        ("application/json;q=0.000, */*;q=0.001", CSV),
        ("text/html, application/xhtml+xml, */*;q=0.8", JSON),
        # of several ranges that fit, the most exact counts (RFC 9110, section 12.5.1)
        ("text/*;q=0.3, text/csv;q=0.7, text/csv;header=absent, */*;q=0.5, application/json;q=0.9", CSV),
        # a range that breaks the grammar is passed over
        ("application/json;q=7, text/csv", CSV),
        ("nonsense, text/csv", CSV),
        # an absurdly long field asks for nothing that could be heeded
        ("text/csv," * 1000, JSON),
    ],
)
def test_best_form_is_chosen(accept, chosen):
    """Quality decides, then the order of the offers."""
    assert chosen == accepted(accept, OFFERS)


@pytest.mark.parametrize(
    "accept",
    ["text/html", "image/*", "text/csv; header=present", "*/*;q=0", "application/json;q=0", "nonsense", "*/json", '"'],
)
def test_nothing_acceptable_is_a_406(accept):
    """The words name the forms that can be had."""
    with pytest.raises(Problem) as caught:
        accepted(accept, OFFERS)
    assert caught.value.status == 406
    assert "application/json or text/csv; header=absent" in caught.value.detail


@pytest.mark.parametrize(
    ("value", "kind"),
    [
        ("application/json", JSON),
        ("Application/JSON", JSON),
        ("application/json; charset=UTF-8", MediaType("application", "json", (("charset", "utf-8"),))),
        ("", None),
        ("json", None),
        ("application/json;", None),
        ("application/json; charset", None),
    ],
)
def test_type_of_a_body(value, kind):
    """Types and parameters do not heed case; what breaks the grammar has no type."""
    assert kind == content_type(value)
