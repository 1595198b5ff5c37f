"""Ranking of search hits and close matches for a text that nothing answers to."""

import re
from collections.abc import Iterable, Mapping
from typing import Protocol

_SPACE = re.compile(r"[\s_\-–]+")

_SPELLINGS = (("sulph", "sulf"), ("aluminium", "aluminum"), ("caesium", "cesium"))


class Row(Protocol):
    """What the ranking reads of a record."""

    key: str
    name: str
    usual: bool
    synonyms: str


def folded(name: str) -> str:
    """Name with case, blanks and hyphens evened out, for comparison.

    A hyphen between two digits or letters of a locant (``1-butene``, ``n-butane``) is kept as a
    blank is: ``iso butane`` and ``isobutane`` stay different only where the trade differs.
    """
    low = _SPACE.sub(" ", name.strip()).casefold()
    for other, usual in _SPELLINGS:
        low = low.replace(other, usual)
    return low


def rank(text: str, rows: Iterable[Row]) -> list[str]:
    """Keys that contain a text in key, name or synonyms, the likeliest first."""
    asked = text.strip()
    low = folded(asked)
    if not low:
        return []
    hits: list[tuple[int, bool, int, str]] = []
    for row in rows:
        score = _score(asked, low, row)
        if score is not None:
            hits.append((score, not row.usual, len(row.key) + len(row.name), row.key))
    hits.sort()
    return [key for *_, key in hits]


def _score(asked: str, low: str, row: Row) -> int | None:
    name = folded(row.name)
    if row.key.startswith(asked):
        return 0
    if name.startswith(low):
        return 1
    if row.key.casefold().startswith(low):
        return 2
    if re.search(r"\b" + re.escape(low), name):
        return 3
    synonyms = folded(row.synonyms.replace("|", " | "))
    if low in synonyms:
        return 4 if re.search(r"(^|\| )" + re.escape(low), synonyms) else 5
    return 6 if low in name else None


def closest(
    text: str, names: Mapping[str, list[str]], keys: Iterable[str], limit: int = 5
) -> tuple[str, ...]:
    """Keys whose spelling or name comes closest to a text."""
    import difflib  # needed for an unknown text alone

    near: list[str] = []
    size = len(text)
    same_size = [k for k in keys if abs(len(k) - size) <= 3]
    folded_keys: dict[str, list[str]] = {}
    for key in same_size:
        folded_keys.setdefault(key.casefold(), []).append(key)
    for hit in difflib.get_close_matches(text.casefold(), folded_keys, limit, 0.7):
        near += folded_keys[hit]
    low = folded(text)
    named = [n for n in names if abs(len(n) - len(low)) <= 3 and n[:1] == low[:1]]
    for hit in difflib.get_close_matches(low, named, limit, 0.75):
        near += names[hit][:1]
    return tuple(dict.fromkeys(near))[:limit]
