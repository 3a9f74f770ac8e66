"""What HTTP caches may do with an answer to a GET (RFC 9110, RFC 9111): a weak validator, how long it keeps, and 304.

An answer is a function of the question and of the data that the service holds, so the validator is made of both and is known
before anything is computed. It is weak, since ``trace.cached`` may differ between two answers with the same numbers. What a
site file lays down can change with the file: such an answer is to be asked for again each time, and its validator says so.
"""

from __future__ import annotations

import hashlib
from typing import Any, Final, NamedTuple

__all__ = ["CACHING", "SITE", "Caching", "Freshness", "matches"]

Environ = dict[str, Any]

CACHING: Final = "gasapi.caching"
"""Key of the environ under which ``Caching`` stands for a GET or HEAD whose answer may be kept."""

SITE: Final = "gasapi.site"
"""Key of the environ that is set where the answer depends on the site file."""

_OF_SITE: Final = "-site"
_OPEN_DOCUMENT: Final = "/openapi.json"
_BY_SITE: Final = "/v1/gases"
_LONGEST_FIELD: Final = 4096


class Caching(NamedTuple):
    """The header fields of a good answer, without and with a part in it that the site file lays down."""

    plain: tuple[tuple[str, str], ...]
    site: tuple[tuple[str, str], ...]

    def fields(self, environ: Environ) -> tuple[tuple[str, str], ...]:
        """Return the fields for the answer to a request."""
        return self.site if environ.get(SITE) else self.plain


class Freshness:
    """How long answers keep.

    :param version: of the service
    :param data: hash of the data and the engine
    :param site: hash of the site file, None where there is none
    :param private: whether answers are for the holder of a token alone
    :param max_age: s for which a cache may give an answer again without asking
    """

    def __init__(self, version: str, data: str, site: str | None, private: bool, max_age: int) -> None:
        self._base = hashlib.blake2b(f"{version}\n{data}\n{site or ''}".encode(), digest_size=12)
        self._has_site = site is not None
        whose = "private" if private else "public"
        self._plain = ("Cache-Control", f"{whose}, max-age={max_age}")
        self._site = ("Cache-Control", "private, no-cache" if private else "no-cache")

    @staticmethod
    def keeps(path: str) -> bool:
        """Return whether answers at a path may be kept; counters, health and the page may not, or say so themselves."""
        return path.startswith("/v1/") or path == _OPEN_DOCUMENT

    def of(self, path: str, query: str, accept: str) -> Caching | None:
        """Return the fields for a GET, None where its answer is not to be kept: counters, health, the page."""
        if not self.keeps(path):
            return None
        digest = self._base.copy()
        digest.update(f"{path}\n{query}\n{accept}".encode("utf-8", "surrogateescape"))
        tag = digest.hexdigest()
        site = (("ETag", f'W/"{tag}{_OF_SITE}"'), self._site)
        if self._has_site and path.startswith(_BY_SITE):
            return Caching(site, site)
        return Caching((("ETag", f'W/"{tag}"'), self._plain), site)


def matches(if_none_match: str, caching: Caching) -> tuple[tuple[str, str], ...] | None:
    """Return the fields of a 304 where a request names the validator of its answer (weak comparison), else None.

    A caller knows the validator only from a good answer to the same question by the same data; nothing need be computed.
    """
    given = {tag.strip().removeprefix("W/") for tag in if_none_match[:_LONGEST_FIELD].split(",")}
    for fields in caching:
        if fields[0][1].removeprefix("W/") in given:
            return fields
    return None
