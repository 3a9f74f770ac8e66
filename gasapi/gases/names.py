"""Names as people type them: folding of case and blanks, and the nearest known names of one that is not known."""

from __future__ import annotations

import unicodedata
from collections import Counter, defaultdict
from collections.abc import Iterable
from difflib import SequenceMatcher

__all__ = ["NearestNames", "folded", "loose"]

_LONGEST = 100
"""Longer texts are cut before they are compared: no gas is called so, and length must not buy work."""

_SHORTLIST = 30
_LEAST_LIKENESS = 0.5
_FURTHEST_FROM_BEST = 0.25
_IGNORED = str.maketrans("", "", " -_,'")


def folded(name: str) -> str:
    """Return a name without regard to case, surrounding or doubled blanks, and raised or lowered digits."""
    return " ".join(unicodedata.normalize("NFKC", name).casefold().split())


def loose(name: str) -> str:
    """Return a folded name without blanks, hyphens, underscores, commas and primes: ``R-134a`` and ``r134a`` are one."""
    return folded(name).translate(_IGNORED)


def _bigrams(name: str) -> set[str]:
    padded = f"^{name}$"
    return {padded[i : i + 2] for i in range(len(padded) - 1)}


class NearestNames:
    """Finds which known names resemble a text most: a shortlist by shared pairs of letters, ranked by common blocks."""

    def __init__(self, names: Iterable[tuple[str, str]]) -> None:
        """Build the index from (name, what to answer for it) pairs; several names may stand for one answer."""
        self._names = [(loose(name), answer) for name, answer in names]
        self._sizes: list[int] = []
        self._index: dict[str, list[int]] = defaultdict(list)
        for place, (name, _) in enumerate(self._names):
            pairs = _bigrams(name)
            self._sizes.append(len(pairs))
            for pair in pairs:
                self._index[pair].append(place)

    def of(self, text: str, count: int = 5) -> tuple[str, ...]:
        """Return at most ``count`` answers whose names are most like a text, the likest first, or none that is like it."""
        wanted = loose(text[:_LONGEST])
        pairs = _bigrams(wanted)
        shared: Counter[int] = Counter()
        for pair in pairs:
            shared.update(self._index.get(pair, ()))
        # Dice's coefficient; the place in the list settles ties, so that the order is always the same
        dice = sorted((-2.0 * n / (len(pairs) + self._sizes[place]), place) for place, n in shared.items())
        best: dict[str, float] = {}
        for negative, place in dice[:_SHORTLIST]:
            name, answer = self._names[place]
            likeness = max(-negative, SequenceMatcher(None, wanted, name, autojunk=False).ratio())
            if likeness >= _LEAST_LIKENESS:
                best[answer] = max(best.get(answer, 0.0), likeness)
        least = max(best.values(), default=0.0) - _FURTHEST_FROM_BEST
        ranked = sorted((answer for answer in best if best[answer] >= least), key=lambda answer: -best[answer])
        return tuple(ranked[:count])
