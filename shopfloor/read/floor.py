"""shop.toml: the shift, the machines, and the headers of an ERP's export."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from datetime import date, datetime, time
from typing import Any
from zoneinfo import ZoneInfo, available_timezones

from shopfloor.model.calendar import Clock
from shopfloor.model.shop import Machine
from shopfloor.read.cells import CellFault, name_of
from shopfloor.read.columns import COLUMNS
from shopfloor.read.headers import loose, nearest
from shopfloor.read.rules import Findings, Place, refuse
from shopfloor.read.shift import Said, Shift, settle, written
from shopfloor.read.source import Readable, take

MAX_FLOOR_BYTES = 256 * 1024
MAX_UNITS = 10_000

# Every key there is: True where this version reads it, False where a later one will.
_TABLES: Mapping[str, bool] = {
    "shift": True, "columns": True, "machine": True, "crew": False, "changeover": False, "transport": False
}  # fmt: skip
_SHIFT: Mapping[str, bool] = {"start": True, "end": True, "zone": True, "breaks": False}
_MACHINE: Mapping[str, bool] = {
    "id": True, "name": True, "count": True, "pauses": False, "closed": False, "crew": False, "heads": False,
    "attended": False,
}  # fmt: skip
_KINDS: tuple[tuple[type, str], ...] = (
    (bool, "true or false"), (str, "a text"), (int, "a number"), (float, "a number"),
    (datetime, "a date and time"), (date, "a date"), (time, "a time of day"),
    (list, "a list"), (dict, "a table"),
)  # fmt: skip


@dataclass(frozen=True)
class Floor:
    """What shop.toml says.

    Attributes
    ----------
    file
        Name of the file, for messages.
    clock, shift_end_s
        From ``[shift]``.
    machines
        In the order of the file; empty when none are listed, and then any machine may stand in the orders.
    columns
        Our column name to the header in an ERP's export.
    inputs
        Name and SHA-256 of the file.
    shift
        What ``[shift]`` said, so that a start or an end given elsewhere can take its place.
    """

    file: str = "shop.toml"
    clock: Clock = field(default_factory=Clock)
    shift_end_s: int | None = None
    machines: tuple[Machine, ...] = ()
    columns: Mapping[str, str] = field(default_factory=dict)
    inputs: tuple[tuple[str, str], ...] = ()
    shift: Shift = field(default_factory=Shift)


def load_floor(source: Readable, *, name: str | None = None) -> Floor:
    """Read shop.toml.

    Parameters
    ----------
    source
        Path, bytes, or an open binary file.
    name
        What messages call it; otherwise the file's name.

    Raises
    ------
    InputError
        With every fault of the file: TOML that cannot be read, unknown keys (with the nearest known one),
        keys that only a later version reads, values of the wrong kind.
    """
    findings = Findings()
    floor = read_floor(source, findings, name=name).floor
    settled = settle(floor.shift, findings)
    findings.stop_if_any()
    assert settled is not None  # a shift that cannot be settled is a fault
    clock, end_s = settled
    return Floor(floor.file, clock, end_s, floor.machines, floor.columns, floor.inputs, floor.shift)


@dataclass(frozen=True, slots=True)
class Draft:
    """As much of a floor as could be read beside its faults; the shift is not yet settled.

    `shift_known` and `machines_known` are false where a fault hides part of what is meant.
    """

    floor: Floor
    shift_known: bool = True
    machines_known: bool = True


def read_floor(source: Readable, findings: Findings, *, name: str | None = None) -> Draft:
    """Read shop.toml, adding its faults to `findings`, and return what is sound.

    Raises
    ------
    InputError
        Only if the file cannot be opened, is no UTF-8, or is not valid TOML.
    """
    taken = take(source, name=name, limit=MAX_FLOOR_BYTES)
    text = _decoded(taken.data, taken.place)
    try:
        tree = tomllib.loads(text)
    except (tomllib.TOMLDecodeError, RecursionError, ValueError) as error:
        raise _syntax_error(error, text, taken.place) from None
    reader = _Reader(taken.place, _lines(text), findings)
    reader.known_keys(tree, _TABLES, "")
    shift, shift_known = reader.shift(tree.get("shift", {}))
    machines, machines_known = reader.machines(tree.get("machine", []))
    columns = reader.columns(tree.get("columns", {}))
    inputs = ((taken.name, taken.sha256),)
    return Draft(
        Floor(taken.name, machines=machines, columns=columns, inputs=inputs, shift=shift),
        shift_known,
        machines_known,
    )


def _decoded(data: bytes, place: Place) -> str:
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise refuse(place, "encoding-broken", encoding="UTF-8", byte=error.start + 1) from None


def _syntax_error(error: Exception, text: str, place: Place) -> Exception:
    """Return the fault for what the TOML parser said: `Expected '=' after a key (at line 3, column 5)`."""
    words = "nested too deeply" if isinstance(error, RecursionError) else str(error)
    reason, _, spot = words.partition(" (at ")
    found = re.match(r"line (\d+)", spot)
    lines = text.splitlines()
    line = int(found[1]) if found else len(lines) if spot else 0
    shown = lines[line - 1].strip() if 0 < line <= len(lines) else ""
    return refuse(place.at(line), "toml-syntax", shown, reason=reason[:1].lower() + reason[1:])


_HEAD = re.compile(r"\s*\[(\[?)\s*([^\[\]#]+?)\s*\]")
_KEY = re.compile(r"""\s*(?:"([^"]*)"|'([^']*)'|([\w-]+))\s*[.=]""")


def _lines(text: str) -> dict[tuple[str, int, str], int]:
    """Return the line of each key by table, count of the table, and key; for messages only.

    The parser does not tell where a value stood. A key inside a text of several lines may mislead this
    search, which then only points at a neighbouring line.
    """
    where: dict[tuple[str, int, str], int] = {}
    table, count, seen = "", 0, dict[str, int]()
    for number, line in enumerate(text.splitlines(), start=1):
        if found := _HEAD.match(line):
            table = found[2].strip().strip("\"'")
            count = seen.get(table, 0) if found[1] else 0
            seen[table] = count + 1
            where.setdefault(("", 0, table.partition(".")[0].strip()), number)
            where.setdefault((table, count, ""), number)
        elif found := _KEY.match(line):
            key = found[1] or found[2] or found[3] or ""
            where.setdefault((table, count, key), number)
    return where


class _Reader:
    """Checks the tables of one file, key by key."""

    def __init__(self, place: Place, lines: Mapping[tuple[str, int, str], int], findings: Findings) -> None:
        self._place = place
        self._lines = lines
        self._findings = findings

    def _at(self, table: str, key: str = "", count: int = 0) -> Place:
        line = self._lines.get((table, count, key)) or self._lines.get((table, count, "")) or 0
        return self._place.at(line or self._lines.get(("", 0, table), 0), f"{table}.{key}".strip("."))

    def known_keys(
        self, tree: Mapping[str, Any], keys: Mapping[str, bool], table: str, count: int = 0
    ) -> None:
        """Report keys that nobody knows, and those that only a later version does."""

        def add(key: str) -> None:
            close = nearest(key, keys)
            self._findings.fault(
                self._at(table, key, count),
                "unknown-key",
                key,
                nearest=f"; the nearest is {close!r}" if close else "",
                known=", ".join(name for name, read in keys.items() if read),
            )

        for key in tree:
            if key in keys and not keys[key]:
                self._findings.fault(self._at(table, key, count), "not-supported-yet", key)
        unknown = [key for key in tree if key not in keys]
        self._findings.each(unknown, len(unknown), add)

    def _kind(self, value: Any, wanted: tuple[type, ...], place: Place, words: str) -> bool:
        """Whether `value` is of a wanted kind; a fault if not."""
        if isinstance(value, wanted) and (bool in wanted or not isinstance(value, bool)):
            return True
        got = next((words for kind, words in _KINDS if isinstance(value, kind)), "something else")
        self._findings.fault(
            place, "wrong-kind", "" if isinstance(value, list | dict) else str(value), got=got, wanted=words
        )
        return False

    def shift(self, tree: Any) -> tuple[Shift, bool]:
        """Read ``[shift]``; also tell whether all of it was of the right kind."""
        if not self._kind(tree, (dict,), self._at("shift"), "a table: [shift]"):
            return Shift(), False
        self.known_keys(tree, _SHIFT, "shift")
        said: dict[str, Said] = {}
        sound = True
        for key, kinds, words in (
            ("start", (str, datetime), 'a date and time such as "2026-03-02T06:00"'),
            ("end", (str, datetime, time), 'a time such as "14:00"'),
        ):
            place = self._at("shift", key)
            if key in tree:
                if self._kind(tree[key], kinds, place, words):
                    said[key] = Said(written(tree[key]), place)
                else:
                    sound = False
        zone, zone_known = self._zone(tree)
        return Shift(said.get("start"), said.get("end"), zone), sound and zone_known

    def _zone(self, tree: Mapping[str, Any]) -> tuple[ZoneInfo | None, bool]:
        place = self._at("shift", "zone")
        if "zone" not in tree:
            return None, True
        name = tree["zone"]
        if not self._kind(name, (str,), place, 'a text such as "Europe/London"'):
            return None, False
        try:
            return ZoneInfo(name), True
        except (KeyError, ValueError, OSError):  # unknown, no name at all, or the name of a folder of zones
            close = nearest(name, sorted(available_timezones()))
            hint = f"; the nearest is {close!r}" if close else ""
            self._findings.fault(place, "zone-unknown", name, nearest=hint)
            return None, False

    def machines(self, entries: Any) -> tuple[tuple[Machine, ...], bool]:
        """Read every ``[[machine]]``; also tell whether all of them have a sound id."""
        if not self._kind(entries, (list,), self._at("machine"), "a list of tables: [[machine]]"):
            return (), False
        machines: list[Machine] = []
        lines: dict[str, int] = {}
        sound = True
        for count, entry in enumerate(entries):
            if not self._kind(entry, (dict,), self._at("machine", "", count), "a table: [[machine]]"):
                sound = False
                continue
            self.known_keys(entry, _MACHINE, "machine", count)
            name = self._text(entry, "id", count, needed=True)
            title = self._text(entry, "name", count)
            units = self._units(entry, count)
            if not name:
                sound = False
                continue
            place = self._at("machine", "id", count)
            if name in lines:
                self._findings.fault(place, "machine-duplicate", name, row=lines[name])
                continue
            lines[name] = place.row
            machines.append(Machine(name, title, units))
        return tuple(machines), sound

    def _text(self, entry: Mapping[str, Any], key: str, count: int, *, needed: bool = False) -> str:
        """Return a name in an entry of ``[[machine]]``, empty when there is none or it is a fault."""
        place = self._at("machine", key, count)
        value = entry.get(key)
        if value is None or (needed and isinstance(value, str) and not value.strip()):
            if needed:
                self._findings.fault(place, "key-missing", table="[[machine]]")
            return ""
        if not self._kind(value, (str,), place, 'a text in quotes, such as "CMM"'):
            return ""
        try:
            return name_of(value.strip())
        except CellFault as fault:
            self._findings.fault(place, fault.rule, value, **fault.words)
            return ""

    def _units(self, entry: Mapping[str, Any], count: int) -> int:
        value = entry.get("count", 1)
        place = self._at("machine", "count", count)
        if not self._kind(value, (int, float), place, "a whole number such as 2"):
            return 1
        if isinstance(value, float) or not 1 <= value <= MAX_UNITS:
            self._findings.fault(place, "count-unusable", str(value), limit=MAX_UNITS)
            return 1
        return int(value)

    def columns(self, tree: Any) -> dict[str, str]:
        """Read ``[columns]``: our name = "their header"."""
        if not self._kind(tree, (dict,), self._at("columns"), "a table: [columns]"):
            return {}
        self.known_keys(tree, dict.fromkeys(COLUMNS, True), "columns")
        mapped: dict[str, str] = {}
        for name, header in _items(tree, COLUMNS):
            place = self._at("columns", name)
            if not self._kind(header, (str,), place, 'a header in quotes, such as "Work Order No"'):
                continue
            other = next((ours for ours, theirs in mapped.items() if loose(theirs) == loose(header)), None)
            if other is not None:
                self._findings.fault(place, "header-mapped-twice", header, name=other)
            elif loose(header):
                mapped[name] = header.strip()
            else:
                self._findings.fault(place, "header-empty", header)
        return mapped


def _items(tree: Mapping[str, Any], known: Mapping[str, Any]) -> Iterator[tuple[str, Any]]:
    return ((key, value) for key, value in tree.items() if key in known)
