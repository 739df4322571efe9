"""Header names: which header means which column, whatever its case, spaces, `_` or `-`."""

from __future__ import annotations

import difflib
import unicodedata
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field

from shopfloor.read.rules import MAX_VALUE_CHARACTERS, shorten

NEAREST_BUDGET = 50_000
HEADER_ROWS = 20  # a title may stand above the header, but not a page of text
_LOOSE = str.maketrans("", "", " _-\u00a0\t\r\n\ufeff")


def loose(header: str) -> str:
    """Return what two spellings of one header have in common."""
    return unicodedata.normalize("NFKC", header).casefold().translate(_LOOSE)


def nearest(name: str, among: Iterable[str], cutoff: float = 0.6) -> str | None:
    """Return the name most like `name`, or None when none is; differences of case count little."""
    folded = {candidate.casefold(): candidate for candidate in reversed(list(among))}
    found = difflib.get_close_matches(name.casefold()[:MAX_VALUE_CHARACTERS], list(folded), 1, cutoff)
    return folded[found[0]] if found else None


class Suggestions:
    """The nearest of some names to one that is not among them, each looked for once.

    Beyond ``NEAREST_BUDGET`` pairs of names compared nothing is suggested any more, since a file whose every
    name is wrong is not helped by it.
    """

    def __init__(self, among: Iterable[str]) -> None:
        self.among = dict.fromkeys(among)
        self._left = NEAREST_BUDGET
        self._found: dict[str, str | None] = {}

    def nearest(self, name: str) -> str | None:
        """Return the name most like `name`, or None when none is."""
        if name not in self._found:
            self._left -= len(self.among)
            self._found[name] = nearest(name, self.among) if self._left >= 0 else None
        return self._found[name]

    def hint(self, name: str) -> str:
        """Return the nearest name as the tail of a sentence, empty when there is none."""
        close = self.nearest(name)
        return f"; the nearest is {close!r}" if close else ""


@dataclass(frozen=True)
class Wanted:
    """The columns a reader looks for.

    Attributes
    ----------
    names
        Our names, in the order of the documentation.
    needed
        Those without which there is no table.
    mapped
        Our name to the header that an ERP gives it, from ``[columns]`` in shop.toml.
    """

    names: tuple[str, ...]
    needed: tuple[str, ...]
    mapped: Mapping[str, str] = field(default_factory=dict)

    def find(self, header: Sequence[str]) -> dict[str, list[int]]:
        """Return the positions of each column in `header`; a mapped header goes before our own name."""
        where: dict[str, list[int]] = {}
        for position, text in enumerate(header):
            where.setdefault(loose(text), []).append(position)
        found: dict[str, list[int]] = {}
        taken: set[str] = set()
        for name in self.names:
            key = loose(self.mapped.get(name, ""))
            if key and key in where:
                found[name] = where[key]
                taken.add(key)
        for name in self.names:
            key = loose(name)
            if name not in found and key in where and key not in taken:
                found[name] = where[key]
        return {name: found[name] for name in self.names if name in found}


def find_header(records: Sequence[Sequence[str]], wanted: Wanted) -> tuple[int, int]:
    """Return which of the first records is the header, and how many of its columns are known.

    It is the first that has every needed column, else the first that is not blank.
    """
    blank = 0
    for index, record in enumerate(records[:HEADER_ROWS]):
        if index == blank and not any(map(str.strip, record)):
            blank += 1
            continue
        found = wanted.find(record)
        if all(name in found for name in wanted.needed):
            return index, len(found)
    first = min(blank, len(records) - 1)
    return first, len(wanted.find(records[first]))


def listed(names: Sequence[str], most: int = 6) -> str:
    """Write names for a sentence, the tail of a long list as a count."""
    shown = ", ".join(repr(shorten(name)) for name in names[:most])
    return f"{shown} and {len(names) - most:,} more" if len(names) > most else shown
