"""Comparisons: every equation that can serve a gas says what it says when asked by name."""

from __future__ import annotations

import pytest

from gasapi.service.comparison import answer_comparison
from gasapi.service.models import MODEL_IDS, why_not
from gasapi.service.questions import GasSpec, StateQuestion


@pytest.mark.parametrize("gas", ["nitrogen", "carbon-dioxide", "silane", "air"])
def test_every_model_that_can_serve_is_there_and_says_what_it_says_alone(context, ask, gas):
    """No more and no less, and the bits of the single state."""
    answer = answer_comparison(context, StateQuestion(GasSpec(gas), 30e5, 310.0))
    resolved = context.gas(GasSpec(gas))
    assert [id for id in MODEL_IDS if why_not(id, resolved) is None] == [m.id for m in answer.models]
    for model in answer.models:
        alone = ask(gas, 310.0, 30e5, model.id)
        assert (alone.density, alone.compressibility_factor) == (model.density, model.compressibility_factor)
        assert alone.model.inside_validity == model.inside_validity


def test_differences_are_to_the_selected_model(context):
    """Which is auto's choice, or the one asked for; its own difference is zero."""
    for asked, selected in (("auto", "reference"), ("peng-robinson", "peng-robinson")):
        answer = answer_comparison(context, StateQuestion(GasSpec("nitrogen"), 100e5, 300.0, asked))
        assert selected == answer.state.model.id
        for model in answer.models:
            if model.density is not None:
                assert (model.density - answer.state.density) / answer.state.density == model.relative_difference
        assert [selected] == [m.id for m in answer.models if m.relative_difference == 0.0]


def test_how_wrong_is_the_ideal_gas(context):
    """Carbon dioxide at 50 bar and 300 K: Z = 0.69 in tables (from memory), so that the ideal density is 31 % low."""
    answer = answer_comparison(context, StateQuestion(GasSpec("carbon-dioxide"), 50e5, 300.0))
    ideal = next(m for m in answer.models if m.id == "ideal-gas")
    assert -0.31 == pytest.approx(ideal.relative_difference, abs=0.01)


def test_a_bad_selected_state_has_no_differences(context):
    """There is nothing to differ from; equations that reach there still say what they say."""
    answer = answer_comparison(context, StateQuestion(GasSpec("nitrogen"), 1e12, 300.0))
    assert "bad" == answer.state.quality.level
    assert {None} == {m.relative_difference for m in answer.models}
