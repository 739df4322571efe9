"""A TOML file as a tree of values whose places are known, and the checks that every key goes through."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from datetime import date, datetime, time
from decimal import Decimal
from fractions import Fraction
from typing import Any

from shopfloor import settings
from shopfloor.model.calendar import MINUTE
from shopfloor.read.cells import CellFault, name_of
from shopfloor.read.headers import Suggestions
from shopfloor.read.rules import Findings, Place, refuse
from shopfloor.read.source import Source
from shopfloor.read.toml_lines import Path, deep_key, lines_of

_KINDS: tuple[tuple[type, str], ...] = (
    (bool, "true or false"), (str, "a text"), (int, "a number"), (Decimal, "a number"),
    (datetime, "a date and time"), (date, "a date"), (time, "a time of day"),
    (list, "a list"), (dict, "a table"),
)  # fmt: skip
NAME = 'a text in quotes, such as "CMM"'


def parse(source: Source, findings: Findings) -> Document:
    """Parse a TOML file.

    Raises
    ------
    InputError
        If it is no UTF-8, or is not valid TOML.
    """
    try:
        text = source.data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise refuse(source.place, "encoding-broken", encoding="UTF-8", byte=error.start + 1) from None
    deep = deep_key(text)
    if deep is not None:
        raise _syntax_error("nested too deeply", text, text.count("\n", 0, deep) + 1, source.place)
    try:
        tree = tomllib.loads(text, parse_float=Decimal)
        return Document(source.place, tree, lines_of(text), findings)
    except RecursionError:
        raise _syntax_error("nested too deeply", text, 0, source.place) from None
    except ValueError as error:  # such as `Expected '=' after a key (at line 3, column 5)`
        reason, _, spot = str(error).partition(" (at ")
        found = re.match(r"line (\d+)", spot)
        line = int(found[1]) if found else len(text.splitlines()) if spot else 0
        raise _syntax_error(reason, text, line, source.place) from None


def _syntax_error(reason: str, text: str, line: int, place: Place) -> Exception:
    lines = text.splitlines()
    shown = lines[line - 1].strip() if 0 < line <= len(lines) else ""
    return refuse(place.at(line), "toml-syntax", shown, reason=reason[:1].lower() + reason[1:])


@dataclass(frozen=True)
class Table:
    """One table of a document: its values, and the path that leads to it."""

    values: Mapping[str, Any]
    path: Path = ()


class Document:
    """The tree of one file; checks key by key, and adds a fault for each that does not do."""

    def __init__(
        self, place: Place, tree: Mapping[str, Any], lines: Mapping[Path, int], findings: Findings
    ) -> None:
        self.place = place
        self.findings = findings
        self.tree = Table(tree)
        self._lines = lines

    def at(self, *path: str | int) -> Place:
        """Return the place of a key; of the table that should hold it, if it is missing.

        Its name counts the elements of a list from 1, but not the tables of `[[machine]]`, which have lines
        of their own: `machine.closed[2].from`.
        """
        known = path
        while known and known not in self._lines:
            known = known[:-1]
        parts = [path[0], *path[2:]] if len(path) > 1 and isinstance(path[1], int) else list(path)
        column = "".join(f"[{part + 1}]" if isinstance(part, int) else f".{part}" for part in parts)
        return self.place.at(self._lines.get(known, 0), column.lstrip("."))

    # ---- tables and lists ------------------------------------------------------------------------

    def table(self, inside: Table, key: str, keys: Iterable[str] | None) -> tuple[Table, bool]:
        """Return the table under `key`, empty if there is none, and whether it is sound.

        `keys` are all it may hold; None where it may hold any.
        """
        path = (*inside.path, key)
        value = inside.values.get(key, {})
        if not self.kind(value, (dict,), self.at(*path), f"a table: [{'.'.join(map(str, path))}]"):
            return Table({}, path), False
        table = Table(value, path)
        return table, keys is None or self.known(table, keys)

    def tables(
        self, inside: Table, key: str, keys: Iterable[str], example: str = ""
    ) -> Iterator[Table | None]:
        """Yield each table of the list under `key`, or None for what is none.

        `example` is one such table as it is written inside the brackets of a list; without it each has a
        heading of its own.
        """
        path = (*inside.path, key)
        wanted = f"a list such as [{example}]" if example else f"a list of tables: [[{key}]]"
        entries = inside.values.get(key, [])
        if not self.kind(entries, (list,), self.at(*path), wanted):
            yield None
            return
        for count, entry in enumerate(entries):
            table = Table(entry, (*path, count))
            one = f"a table such as {example}" if example else f"a table: [[{key}]]"
            if self.kind(entry, (dict,), self.at(*table.path), one):
                self.known(table, keys)
                yield table
            else:
                yield None

    def known(self, table: Table, keys: Iterable[str]) -> bool:
        """Whether a table holds no key but those of `keys`; a fault for every other."""
        keys = tuple(keys)
        unknown = [key for key in table.values if key not in keys]
        near = Suggestions(keys)

        def add(key: str) -> None:
            self.findings.fault(
                self.at(*table.path, key),
                "unknown-key",
                key,
                nearest=near.hint(key),
                known=", ".join(keys),
            )

        self.findings.each(unknown, len(unknown), add)
        return not unknown

    # ---- values ----------------------------------------------------------------------------------

    def kind(self, value: Any, wanted: tuple[type, ...], place: Place, words: str) -> bool:
        """Whether `value` is of a wanted kind; a fault if not."""
        if isinstance(value, wanted) and (bool in wanted or not isinstance(value, bool)):
            return True
        got = next((words for kind, words in _KINDS if isinstance(value, kind)), "something else")
        shown = "" if isinstance(value, list | dict) else str(value)
        self.findings.fault(place, "wrong-kind", shown, got=got, wanted=words)
        return False

    def name(self, table: Table, key: str, *, needed_by: str = "") -> str:
        """Return a name, empty where there is none or it is a fault; `needed_by` says what must have one."""
        place = self.at(*table.path, key)
        value = table.values.get(key)
        if value is None or (needed_by and isinstance(value, str) and not value.strip()):
            if needed_by:
                self.findings.fault(place, "key-missing", table=needed_by)
            return ""
        if not self.kind(value, (str,), place, NAME):
            return ""
        try:
            return name_of(value.strip())
        except CellFault as fault:
            self.findings.fault(place, fault.rule, value, **fault.words)
            return ""

    def truth(self, table: Table, key: str) -> bool:
        """Return a truth; false where there is none or it is a fault."""
        value = table.values.get(key, False)
        return self.kind(value, (bool,), self.at(*table.path, key), "true or false") and bool(value)

    def whole(self, table: Table, key: str, least: int, most: int, rule: str) -> int | None:
        """Return a whole number from `least` to `most`, None where there is none or it is a fault."""
        if key not in table.values:
            return None
        value, place = table.values[key], self.at(*table.path, key)
        if not self.kind(value, (int, Decimal), place, "a whole number such as 2"):
            return None
        if isinstance(value, Decimal) or not least <= value <= most:
            self.findings.fault(place, rule, str(value), limit=most)
            return None
        return int(value)

    def minutes(self, table: Table, key: str) -> int | None:
        """Return decimal minutes in whole seconds, None where there are none or they are a fault."""
        if key not in table.values:
            return None
        value, place = table.values[key], self.at(*table.path, key)
        if not self.kind(value, (int, Decimal), place, "a number of minutes such as 15 or 7.5"):
            return None
        seconds = _seconds(value)
        if seconds is None:
            self.findings.fault(place, "minutes-unusable", str(value), limit=settings.MAX_MINUTES)
        return seconds


def _seconds(minutes: int | Decimal) -> int | None:
    """Return minutes as whole seconds; None if they are none, or less than nothing, or more than a year."""
    if isinstance(minutes, Decimal):
        exponent = minutes.as_tuple().exponent
        # Digits beyond any clock's are refused first: as a fraction, 1e-999999999 would fill the memory.
        if not isinstance(exponent, int) or exponent < -20:
            return None
    if not 0 <= minutes <= settings.MAX_MINUTES:
        return None
    seconds = Fraction(minutes) * MINUTE
    return int(seconds) if seconds.denominator == 1 else None
