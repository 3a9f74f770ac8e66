"""Many threads over shared caches, small enough that entries come and go all the time."""

from __future__ import annotations

import random
from concurrent.futures import ThreadPoolExecutor

from gasapi.gases.catalogue import Catalogue
from gasapi.service.context import CacheSizes, Context
from gasapi.service.questions import GasSpec, StateQuestion
from gasapi.service.state import answer_state

GASES = (
    GasSpec("nitrogen"),
    GasSpec("propane"),
    GasSpec("1-butanol"),
    GasSpec("air"),
    GasSpec(fractions=(("methane", 0.9), ("nitrogen", 0.1))),
    GasSpec(fractions=(("methane", 0.7), ("hydrogen", 0.3)), basis="mass"),
)
MODELS = ("auto", "van-der-waals")


def test_threads_find_what_one_finds():
    """Eight threads, each in an order of its own, have the bits that one thread has with caches that lose nothing."""
    questions = [
        StateQuestion(gas, pressure, temperature, model)
        for gas in GASES
        for model in MODELS
        for pressure in (1e5, 9e6)
        for temperature in (250.0, 420.0)
    ]
    alone = Context(Catalogue.load())
    expected = {question: answer_state(alone, question).answer for question in questions}
    shared = Context(Catalogue.load(), sizes=CacheSizes(gases=3, compositions=5, systems=2, states=8))

    def ask(seed: int) -> list[StateQuestion]:
        order = list(questions)
        random.Random(seed).shuffle(order)
        return [question for question in order if answer_state(shared, question).answer != expected[question]]

    with ThreadPoolExecutor(8) as pool:
        assert [[]] * 8 == list(pool.map(ask, range(8)))
    counts = shared.cache_counts()["states"]
    assert 8 == counts.held
    assert 8 * len(questions) == counts.hits + counts.misses
