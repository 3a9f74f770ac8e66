"""Which form of an answer a caller takes (RFC 9110, section 12.5.1), and what form a body has."""

from __future__ import annotations

import re
from functools import lru_cache
from typing import NamedTuple

from gasapi.web.problems import Problem

__all__ = ["CSV", "JSON", "MediaType", "accepted", "content_type"]

_KEPT_HEADERS = 256
_LONGEST_ACCEPT = 4096

_TOKEN = r"[!#$%&'*+\-.^_`|~0-9A-Za-z]+"
_MEDIA_RANGE = re.compile(rf"\s*({_TOKEN})/({_TOKEN})\s*")
_PARAMETER = re.compile(rf';\s*({_TOKEN})\s*=\s*({_TOKEN}|"(?:[^"\\]|\\.)*")\s*')
_QUALITY = re.compile(r"0(\.\d{0,3})?|1(\.0{0,3})?")


class MediaType(NamedTuple):
    """A media type with its parameters, in lower case."""

    type: str
    subtype: str
    parameters: tuple[tuple[str, str], ...] = ()

    def __str__(self) -> str:
        return f"{self.type}/{self.subtype}" + "".join(f"; {name}={value}" for name, value in self.parameters)


JSON = MediaType("application", "json")
CSV = MediaType("text", "csv", (("header", "absent"),))
"""RFC 4180 without a header line."""


@lru_cache(maxsize=_KEPT_HEADERS)
def accepted(accept: str, offers: tuple[MediaType, ...]) -> MediaType:
    """Return the offer that an ``Accept`` field likes best, the first of those it likes as well; an empty field takes any.

    A range without parameters takes a type with them; of several ranges that fit an offer the most exact one counts.

    :raises Problem: 406 where no offer is acceptable
    """
    if not accept.strip() or len(accept) > _LONGEST_ACCEPT:
        return offers[0]
    ranges = [_media_range(part) for part in _parts(accept)]
    best, best_quality = None, 0.0
    for offer in offers:
        fits = [found for found in ranges if found is not None and _fits(found[0], offer)]
        if not fits:
            continue
        quality = max(fits, key=lambda found: _exactness(found[0]))[1]
        if quality > best_quality:
            best, best_quality = offer, quality
    if best is None:
        raise Problem(406, f"the answer can be had as {' or '.join(map(str, offers))}")
    return best


@lru_cache(maxsize=_KEPT_HEADERS)
def content_type(value: str) -> MediaType | None:
    """Return the media type of a body from its ``Content-Type``, None where the field is empty or broken."""
    found = _media_range(value)
    return found[0] if found else None


def _parts(field: str) -> list[str]:
    """Split a list at its commas, but not inside quotes."""
    return re.findall(r'(?:[^,"]|"(?:[^"\\]|\\.)*")+', field)


def _media_range(text: str) -> tuple[MediaType, float] | None:
    """Return a media range and its quality; None where it breaks the grammar."""
    head = _MEDIA_RANGE.match(text)
    if head is None:
        return None
    at, parameters, quality = head.end(), [], 1.0
    while at < len(text):
        found = _PARAMETER.match(text, at)
        if found is None:
            return None
        name, value = found[1].lower(), found[2].strip('"').lower()
        if name == "q":
            if not _QUALITY.fullmatch(value):
                return None
            quality = float(value)
        else:
            parameters.append((name, value))
        at = found.end()
    return MediaType(head[1].lower(), head[2].lower(), tuple(sorted(parameters))), quality


def _fits(wanted: MediaType, offer: MediaType) -> bool:
    if wanted.type == "*":
        return wanted.subtype == "*"
    if wanted.type != offer.type or wanted.subtype not in ("*", offer.subtype):
        return False
    mine = dict(offer.parameters)
    return all(
        mine.get(name) == value or (name == "charset" and value in ("utf-8", "us-ascii")) for name, value in wanted.parameters
    )


def _exactness(wanted: MediaType) -> tuple[bool, bool, int]:
    return wanted.type != "*", wanted.subtype != "*", len(wanted.parameters)
