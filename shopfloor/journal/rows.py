"""Rows of a table become entries, or the complete list of their faults. Pure: the file is read elsewhere."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Mapping
from typing import Any

from shopfloor.journal import moments
from shopfloor.journal.entries import Entry, checked
from shopfloor.journal.errors import EntryError, Refusal
from shopfloor.model.actuals import Kind
from shopfloor.model.clock import Clock
from shopfloor.model.results import Fault

# Column by column, what a table of events may have; the first two it must.
COLUMNS = (
    "event", "at", "order", "machine", "piece", "unit", "good", "scrap", "reason", "minutes", "heads", "pool",
    "text", "release", "due", "priority", "who", "id",
)  # fmt: skip
NEEDED = COLUMNS[:2]

# The words of the command line and of the journal.
WORDS: Mapping[str, Kind] = {
    "start": Kind.STARTED,
    "stop": Kind.STOPPED,
    "resume": Kind.RESUMED,
    "finish": Kind.FINISHED,
    "left": Kind.LEFT,
    "down": Kind.DOWN,
    "up": Kind.UP,
    "crew": Kind.CREW,
    "add": Kind.ADDED,
    "change": Kind.CHANGED,
    "cancel": Kind.CANCELLED,
    "remark": Kind.REMARK,
} | {kind.value: kind for kind in Kind if kind not in (Kind.ISSUED, Kind.WITHDRAWN)}

_COLUMN_OF = {"left_s": "minutes", "operations": "minutes", "release_s": "release", "due_s": "due"}
_WORD = {kind: word for word, kind in reversed(list(WORDS.items()))}  # as help and messages call it
_LEFT = (Kind.STARTED, Kind.STOPPED, Kind.RESUMED, Kind.LEFT)
_ORDERS = (Kind.ADDED, Kind.CHANGED)


class Rows:
    """Reads rows one by one; keeps what they say and what is wrong with them.

    Parameters
    ----------
    clock, now_s
        To read times with.
    minutes
        Reads a length of time as seconds; raises :class:`EntryError`.
    file, sheet
        What messages call the table.
    """

    def __init__(
        self, clock: Clock, now_s: int | None, minutes: Callable[[str], int], file: str, sheet: str = ""
    ) -> None:
        self._clock, self._now_s, self._minutes = clock, now_s, minutes
        self._file, self._sheet = file, sheet
        self.entries: list[Entry] = []
        self.rows: list[int] = []
        self.faults: list[Fault] = []

    def take(self, row: int, cells: Mapping[str, str]) -> None:
        """Read one row; blank cells and missing columns say nothing."""
        said = {name: text for name, text in cells.items() if text}
        values: dict[str, Any] = {}
        before = len(self.faults)
        for name, text in said.items():
            try:
                values[name] = self._value(name, text)
            except EntryError as error:
                self._fault(row, error, said)
        for name in NEEDED:
            if name not in said:
                self._fault(row, EntryError(name, "", f"{name}-missing", "is empty", "fill it in"), said)
        if len(self.faults) > before:
            return
        try:
            entry = checked(_entry(values))
        except EntryError as error:
            self._fault(row, error, said)
            return
        self.entries.append(entry)
        self.rows.append(row)

    def refused(self, refusals: Iterable[Refusal]) -> list[Fault]:
        """Return why entries cannot be as faults of their rows."""
        return [
            Fault(
                file=self._file,
                sheet=self._sheet,
                row=self.rows[one.index],
                column="event",
                value=_WORD[self.entries[one.index].kind],
                rule=one.rule,
                problem=f"cannot be: {one.problem}",
                advice=one.advice,
            )
            for one in refusals
        ]

    def _value(self, name: str, text: str) -> Any:
        if name == "event":
            kind = WORDS.get(text.casefold())
            if kind is None:
                known = ", ".join(list(WORDS)[:12])
                raise EntryError(name, text, "event-unknown", "is no event", f"write one of {known}")
            return kind
        if name in ("at", "release", "due"):
            return moments.read(self._clock, text, self._now_s, field=name)
        if name == "minutes":
            return self._minutes(text)
        if name == "priority":
            return _number(name, text)
        if name in ("piece", "unit", "good", "scrap", "heads"):
            return whole(name, text)
        return text

    def _fault(self, row: int, error: EntryError, said: Mapping[str, str]) -> None:
        column = _COLUMN_OF.get(error.field, error.field)
        value = said.get(column, error.value)
        shown = "".join(c if c.isprintable() else "?" for c in value)
        shown = shown if len(shown) <= 40 else shown[:39] + "…"
        fault = Fault(
            self._file, row, column, shown, error.rule, error.problem, error.advice, sheet=self._sheet
        )
        self.faults.append(fault)


def whole(name: str, text: str) -> int:
    """Read a whole number from 0 on.

    Raises
    ------
    EntryError
        If it is none; whether it is too large is for the entry to say.
    """
    digits = text.strip()
    if not (digits.isascii() and digits.isdecimal() and len(digits) < 16):
        raise EntryError(name, text, f"{name}-unusable", "is no whole number from 0 on", "correct it")
    return int(digits)


def _number(name: str, text: str) -> float:
    if not re.fullmatch(r"[0-9]{1,9}(?:[.,][0-9]{1,9})?", text):
        raise EntryError(name, text, f"{name}-unusable", "is no number", "write digits such as 2 or 2.5")
    return float(text.replace(",", "."))


def _entry(values: Mapping[str, Any]) -> Entry:
    kind: Kind = values["event"]
    data: dict[str, Any] = {
        name: values[name]
        for name in ("good", "scrap", "reason", "heads", "pool", "text", "priority")
        if name in values
    }
    data |= {f"{name}_s": values[name] for name in ("release", "due") if name in values}
    machine = values.get("machine", "")
    if "minutes" in values and kind in _ORDERS:
        data["operations"] = [(machine, values["minutes"])]
    elif "minutes" in values:
        data["left_s"] = values["minutes"]
    if kind in _ORDERS:
        if machine and "minutes" not in values:
            raise EntryError(
                "minutes", "", "minutes-missing", "is empty", f"say how long it takes on {machine}"
            )
        machine = ""
    return Entry(
        kind=kind,
        at_s=values["at"],
        who=values.get("who", ""),
        order=values.get("order", ""),
        machine=machine,
        piece=values.get("piece", 0),
        unit=values.get("unit", 0),
        id=values.get("id", ""),
        data=data,
    )
