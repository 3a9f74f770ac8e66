"""The memo of answers: bounded by number and by bytes, the least recently used leaves."""

from __future__ import annotations

from concurrent.futures import ThreadPoolExecutor

from gasapi.web.edge import Reply
from gasapi.web.memo import Memo


def reply(n: int, size: int = 10) -> Reply:
    return Reply([], bytes([n % 256]) * size)


def test_gives_back_what_was_put():
    """A key has the answer that was put last under it."""
    memo = Memo(10, 10**6)
    memo.put("a", 1, reply(1))
    memo.put("a", 1, reply(2))
    assert (reply(2), None, 1) == (memo.get("a"), memo.get("b"), memo.entries)


def test_holds_at_most_so_many():
    """The one that was not asked for longest leaves first."""
    memo = Memo(3, 10**6)
    for n in range(3):
        memo.put(n, 1, reply(n))
    memo.get(0)
    memo.put(3, 1, reply(3))
    assert [True, False, True, True] == [memo.get(n) is not None for n in range(4)]


def test_holds_at_most_so_many_bytes():
    """Bytes of keys and bodies stay within the bound, whatever comes."""
    memo = Memo(10**6, 200_000)
    for n in range(1000):
        memo.put(n, n % 500, reply(n, n % 1500))
        assert memo.size <= 200_000
    assert 50 < memo.entries < 1000


def test_one_answer_does_not_drive_out_all_others():
    """What would fill more than a hundredth is not held."""
    memo = Memo(10, 100_000)
    memo.put("small", 1, reply(1))
    memo.put("large", 1, reply(2, 1000))
    assert memo.get("small") is not None
    assert memo.get("large") is None


def test_a_memo_of_nothing_holds_nothing():
    """Bounds of 0 turn it off."""
    memo = Memo(0, 0)
    memo.put("a", 1, reply(1))
    assert (memo.get("a"), memo.entries, memo.size) == (None, 0, 0)


def test_many_threads_leave_it_whole():
    """Bounds hold and every key has its own answer under eight threads."""
    memo = Memo(50, 10**6)

    def work(seed: int) -> bool:
        keys = [(seed * 7919 + n * 104729) % 200 for n in range(5000)]
        for key in keys:
            memo.put(key, 4, reply(key))
            found = memo.get(key)
            if found is not None and found != reply(key):
                return False
        return True

    with ThreadPoolExecutor(8) as pool:
        assert all(pool.map(work, range(8)))
    assert memo.entries <= 50
    assert memo.size <= 50 * 500
