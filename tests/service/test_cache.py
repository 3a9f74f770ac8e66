"""The bounded memo."""

from __future__ import annotations

import threading

import pytest
from hypothesis import settings
from hypothesis import strategies as st
from hypothesis.stateful import RuleBasedStateMachine, invariant, rule

from gasapi.service.cache import BoundedCache


def test_the_least_recently_used_entry_leaves_first():
    """A look-up renews an entry."""
    cache = BoundedCache(2)
    cache.put("a", 1)
    cache.put("b", 2)
    assert cache.get("a") == 1
    cache.put("c", 3)
    assert (cache.get("a"), cache.get("b"), cache.get("c")) == (1, None, 3)


def test_counters():
    """Hits, misses, entries and the bound."""
    cache = BoundedCache(3)
    assert cache.get_or_make("x", lambda: 7) == 7
    assert cache.get_or_make("x", lambda: 8) == 7
    assert cache.counts() == (1, 1, 1, 3)


def test_a_cache_without_room_is_refused():
    """A bound below 1 would be a cache that lies."""
    with pytest.raises(ValueError, match="at least one"):
        BoundedCache(0)


def test_many_threads_see_only_right_entries():
    """Eight threads over more keys than there is room for: the bound holds and no key has another's value."""
    cache = BoundedCache(50)
    wrong = []

    def work(seed):
        for i in range(4000):
            key = (i * seed) % 97
            if cache.get_or_make(key, lambda key=key: key * key) != key * key:
                wrong.append(key)

    threads = [threading.Thread(target=work, args=(s,)) for s in (1, 3, 5, 7, 11, 13, 17, 19)]
    for t in threads:
        t.start()
    for t in threads:
        t.join()
    assert wrong == []
    counts = cache.counts()
    assert counts.held <= 50
    assert counts.hits + counts.misses == 8 * 4000


class CacheAgainstModel(RuleBasedStateMachine):
    """Any sequence of calls leaves the cache as a list of recently used entries would be."""

    def __init__(self):
        super().__init__()
        self.cache = BoundedCache(4)
        self.recent = []

    @rule(key=st.integers(0, 9), value=st.integers(1, 100))
    def put(self, key, value):
        held = [k for k, _ in self.recent]
        self.cache.put(key, value)
        if key in held:
            self.recent[held.index(key)] = (key, value)
        else:
            self.recent = [*self.recent, (key, value)][-4:]

    @rule(key=st.integers(0, 9))
    def get(self, key):
        expected = next((v for k, v in self.recent if k == key), None)
        assert self.cache.get(key) == expected
        if expected is not None:
            self.recent = [*(e for e in self.recent if e[0] != key), (key, expected)]

    @invariant()
    def within_its_bound(self):
        assert self.cache.counts().held == len(self.recent) <= 4


CacheAgainstModel.TestCase.settings = settings(max_examples=60, stateful_step_count=30, deadline=None)
TestCacheAgainstModel = CacheAgainstModel.TestCase
