"""The worked examples of a page: the questions and the parts of their answers, as they stand there."""

from __future__ import annotations

import json
from html.parser import HTMLParser
from typing import Any, NamedTuple

__all__ = ["Example", "examples_of"]


class Example(NamedTuple):
    """A question of a call, and the members of its answer that the page shows; text where the answer is no JSON."""

    call: str
    question: dict[str, Any]
    answer: Any


class _Reader(HTMLParser):
    def __init__(self) -> None:
        super().__init__(convert_charrefs=True)
        self.found: list[tuple[str, str, str]] = []
        self._kind = self._call = ""
        self._text: list[str] = []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        if tag == "pre":
            given = dict(attrs)
            self._kind = (given.get("class") or "").split(" ")[0]
            self._call = given.get("data-call") or ""
            self._text = []

    def handle_data(self, data: str) -> None:
        if self._kind:
            self._text.append(data)

    def handle_endtag(self, tag: str) -> None:
        if tag == "pre":
            self.found.append((self._kind, self._call, "".join(self._text)))
            self._kind = ""


def examples_of(source: str) -> list[Example]:
    """Return the worked examples of a page, in order.

    :param source: the page
    :raises ValueError: a question has no answer behind it, or is no JSON
    """
    reader = _Reader()
    reader.feed(source)
    parts = [part for part in reader.found if part[0] in ("question", "answer")]
    examples = []
    for (kind, call, question), (next_kind, _, answer) in zip(parts[::2], parts[1::2], strict=True):
        if (kind, next_kind) != ("question", "answer"):
            raise ValueError(f"{kind} is followed by {next_kind}")
        asked = json.loads(question)
        examples.append(Example(call, asked, answer if asked.get("format") in ("csv", "st") else json.loads(answer)))
    return examples
