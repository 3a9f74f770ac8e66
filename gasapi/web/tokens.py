"""Bearer tokens (RFC 6750): who may ask. The file holds one token a line; blank lines and lines that begin with # are left out.

A line is either a plain token, or ``sha256:<hex digits> <name> <last day>`` with the digest of a token, the name of its
holder and the last day (ISO 8601, UTC) on which it is good. A token is a long random string, so that a plain digest keeps it
as well as a slow one would.
"""

from __future__ import annotations

import hashlib
import hmac
import re
import secrets
from collections.abc import Iterable
from datetime import UTC, date, datetime
from pathlib import Path
from typing import NamedTuple

from gasapi.errors import GasapiError

__all__ = ["Token", "TokenFileError", "TokenList", "new_token"]

SHORTEST = 16
"""Characters that a plain token has at least."""

# b64token of RFC 6750, section 2.1
_GRAMMAR = re.compile(r"[A-Za-z0-9\-._~+/]+=*")


class TokenFileError(GasapiError):
    """A line of the token file cannot be used; the words never show the line itself."""

    def __init__(self, line: int, why: str) -> None:
        self.line = line
        self.why = why
        super().__init__(f"line {line} of the token file: {why}")


class Token(NamedTuple):
    """A token that is good: its digest, its holder's name and its last day, None where it has none."""

    digest: bytes
    name: str
    last_day: date | None


class TokenList:
    """The tokens that are good. Immutable."""

    def __init__(self, tokens: Iterable[Token]) -> None:
        self._tokens = tuple(tokens)

    def __len__(self) -> int:
        return len(self._tokens)

    @classmethod
    def from_file(cls, path: Path) -> TokenList:
        """Read a token file.

        :raises TokenFileError: a line is neither a token nor a digest, or there is no token at all
        """
        lines = path.read_text(encoding="utf-8").splitlines()
        tokens = [_token(number, line.strip()) for number, line in enumerate(lines, 1) if not _blank(line)]
        if not tokens:
            raise TokenFileError(0, "there is no token in it")
        return cls(tokens)

    def any_good(self, today: date | None = None) -> bool:
        """Return whether there is a token left that has not expired."""
        day = today or datetime.now(UTC).date()
        return any(token.last_day is None or day <= token.last_day for token in self._tokens)

    def holder(self, authorization: str, today: date | None = None) -> str | None:
        """Return the name of the holder of a token, None where it is not good.

        Every token is compared, each in a time that does not depend on how much of it agrees.

        :param authorization: the value of the ``Authorization`` header field
        :param today: the day, UTC; that of the clock by default
        """
        scheme, _, token = authorization.partition(" ")
        if scheme.lower() != "bearer":
            return None
        digest = hashlib.sha256(token.strip().encode("latin-1", "replace")).digest()
        day = today or datetime.now(UTC).date()
        holder = None
        for good in self._tokens:
            if hmac.compare_digest(digest, good.digest) and (good.last_day is None or day <= good.last_day):
                holder = good.name
        return holder


def new_token(name: str, last_day: date) -> tuple[str, str]:
    """Return a new random token and the line of the token file that lets it in.

    :raises ValueError: the name is empty or holds white space
    """
    if not name or name.split() != [name]:
        raise ValueError("the name of a token is one word")
    token = secrets.token_urlsafe(32)
    return token, f"sha256:{hashlib.sha256(token.encode()).hexdigest()} {name} {last_day.isoformat()}"


def _blank(line: str) -> bool:
    return not line.strip() or line.lstrip().startswith("#")


def _token(number: int, line: str) -> Token:
    if line.startswith("sha256:"):
        words = line.split()
        if len(words) != 3:
            raise TokenFileError(number, "a digest is followed by a name and a last day")
        try:
            digest = bytes.fromhex(words[0].removeprefix("sha256:"))
            last_day = date.fromisoformat(words[2])
        except ValueError:
            raise TokenFileError(number, "give sha256:<64 hex digits> <name> <YYYY-MM-DD>") from None
        if len(digest) != hashlib.sha256().digest_size:
            raise TokenFileError(number, "a SHA-256 digest has 64 hex digits")
        return Token(digest, words[1], last_day)
    if not _GRAMMAR.fullmatch(line):
        raise TokenFileError(number, "a token has letters, digits and - . _ ~ + / only")
    if len(line) < SHORTEST:
        raise TokenFileError(number, f"a token has at least {SHORTEST} characters")
    return Token(hashlib.sha256(line.encode()).digest(), f"line-{number}", None)
