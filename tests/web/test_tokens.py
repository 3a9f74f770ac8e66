"""Tokens: plain and hashed, with names and last days."""

from __future__ import annotations

import hashlib
from datetime import date

import pytest

from gasapi.web.tokens import TokenFileError, TokenList, new_token

PLAIN = "correct-horse-battery"
TODAY = date(2026, 3, 1)


@pytest.fixture
def tokens(tmp_path):
    """Return a function that reads lines as a token file."""

    def read(*lines: str) -> TokenList:
        path = tmp_path / "tokens"
        path.write_text("\n".join(lines))
        return TokenList.from_file(path)

    return read


def test_plain_token_lets_in(tokens):
    """A token on a line of its own is good, and nothing else is."""
    known = tokens("# of the control room", "", f"  {PLAIN}  ")
    assert known.holder(f"Bearer {PLAIN}", TODAY) == "line-3"
    assert known.holder(f"bearer {PLAIN}", TODAY) == "line-3"
    refused = [
        "",
        "Bearer",
        "Bearer ",
        PLAIN,
        f"Basic {PLAIN}",
        f"Bearer {PLAIN}x",
        f"Bearer {PLAIN[:-1]}",
        "Bearer \u00ff\u0100",
    ]
    assert [None] * len(refused) == [known.holder(value, TODAY) for value in refused]


def test_hashed_token_lets_in_until_its_last_day(tokens):
    """The line that the command writes lets the token in, and names its holder."""
    token, line = new_token("historian", date(2026, 3, 1))
    known = tokens(line)
    assert token not in line
    assert known.holder(f"Bearer {token}", date(2026, 3, 1)) == "historian"
    assert known.holder(f"Bearer {token}", date(2026, 3, 2)) is None
    assert known.holder(f"Bearer {hashlib.sha256(token.encode()).hexdigest()}", TODAY) is None


def test_tokens_are_random():
    """No two tokens are alike."""
    assert len({new_token("x", TODAY)[0] for _ in range(100)}) == 100


@pytest.mark.parametrize("name", ["", "two words", " x"])
def test_name_of_a_token_is_one_word(name):
    """A name that would break the line is refused."""
    with pytest.raises(ValueError, match="one word"):
        new_token(name, TODAY)


@pytest.mark.parametrize(
    ("line", "why"),
    [
        ("short", "at least 16"),
        ("a token with blanks", "letters, digits"),
        ("sha256:abc historian 2026-03-01", "64 hex digits"),
        ("sha256:" + "0" * 64, "followed by a name"),
        ("sha256:" + "0" * 64 + " historian soon", "YYYY-MM-DD"),
        ("sha256:" + "g" * 64 + " historian 2026-03-01", "64 hex digits"),
        ("# nothing but a remark", "no token"),
    ],
)
def test_a_line_that_is_no_token_is_told_by_its_number(tokens, line, why):
    """The words never show the line itself, which may be a token with a typing error."""
    with pytest.raises(TokenFileError, match=why) as caught:
        tokens("#", line)
    assert line not in str(caught.value)
