"""Lines from a bar-code scanner that types like a keyboard become entries. Pure.

Grammar: a line is one code, or several parted by tabs. A code is

- the name of a machine or of an order of the shift;
- a verb, in any case: START, STOP, RESUME, FINISH, DOWN, UP, which completes an entry, or CLEAR, which drops
  what was scanned for it;
- NAME=value: ORDER, MACHINE (for names that read like verbs, or name both), PIECE, UNIT, GOOD, SCRAP, LEFT
  (minutes), REASON, AT (a time; now without it), WHO (stays until the next WHO).

So `CMM`, `TQ-014`, `START` on three lines start TQ-014 on the CMM. A line with a fault changes nothing.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field, replace
from typing import Any

from shopfloor.journal.entries import Entry, checked
from shopfloor.journal.errors import EntryError
from shopfloor.journal.rows import whole
from shopfloor.model.actuals import Kind

VERBS: Mapping[str, Kind] = {
    "START": Kind.STARTED,
    "STOP": Kind.STOPPED,
    "RESUME": Kind.RESUMED,
    "FINISH": Kind.FINISHED,
    "DOWN": Kind.DOWN,
    "UP": Kind.UP,
}
CLEAR = "CLEAR"
_NAMES = frozenset({"ORDER", "MACHINE", "PIECE", "UNIT", "GOOD", "SCRAP", "LEFT", "REASON", "AT", "WHO"})
_WHOLE = frozenset({"PIECE", "UNIT", "GOOD", "SCRAP"})
_MACHINE_ONLY = (Kind.DOWN, Kind.UP)
MAX_LINE = 4_000  # characters; what is longer comes from no scanner


@dataclass(frozen=True, slots=True)
class Line:
    """What became of one line: entries to record, and what is kept for the next, or what is wrong."""

    entries: tuple[Entry, ...] = ()
    kept: str = ""
    fault: str = ""


@dataclass(frozen=True, slots=True)
class _Scanned:
    """What was scanned towards the next entry."""

    values: Mapping[str, Any] = field(default_factory=dict)
    who: str = ""


class Scanner:
    """Takes lines one by one.

    Parameters
    ----------
    knows
        Returns the order and the machine that a code names, each None if it names none.
    moment, minutes
        Read a time and a length of time as seconds; raise :class:`EntryError`.
    machine
        For a scanner fixed to one machine: its name when none was scanned.
    who
        Who scans, until a WHO says otherwise.
    """

    def __init__(
        self,
        knows: Callable[[str], tuple[str | None, str | None]],
        moment: Callable[[str], int],
        minutes: Callable[[str], int],
        *,
        machine: str = "",
        who: str = "",
    ) -> None:
        self._knows, self._moment, self._minutes, self._machine = knows, moment, minutes, machine
        self._scanned = _Scanned(who=who)

    @property
    def pending(self) -> str:
        """What was scanned and no verb has completed."""
        return " ".join(f"{name}={value}" for name, value in self._scanned.values.items())

    def take(self, line: str) -> Line:
        """Take one line; a blank one says nothing."""
        codes = [code.strip() for code in line.rstrip("\r\n").split("\t") if code.strip()]
        scanned = self._scanned
        entries: list[Entry] = []
        try:
            if len(line) > MAX_LINE:
                raise EntryError("line", line[:40], "line-too-long", "is too long", "scan one code a line")
            for code in codes:
                scanned, entry = self._code(scanned, code)
                if entry is not None:
                    entries.append(entry)
        except EntryError as error:
            shown = "".join(c if c.isprintable() else "?" for c in error.value[:40])
            value = f"{shown!r} " if shown else ""
            return Line(fault=f"{error.field}: {value}{error.problem}; {error.advice}")
        self._scanned = scanned
        return Line(tuple(entries), self.pending if codes else "")

    def _code(self, scanned: _Scanned, code: str) -> tuple[_Scanned, Entry | None]:
        word = code.upper()
        if word == CLEAR:
            return replace(scanned, values={}), None
        if word in VERBS:
            return replace(scanned, values={}), self._entry(VERBS[word], scanned)
        name, equals, value = code.partition("=")
        name, value = name.strip().upper(), value.strip()
        if equals and name in _NAMES:
            return self._named(scanned, name, value), None
        order, machine = self._knows(code)
        if order is not None and machine is not None:
            advice = f"scan ORDER={code} or MACHINE={code}"
            raise EntryError("code", code, "code-ambiguous", "names an order and a machine", advice)
        if order is None and machine is None:
            advice = "scan a machine, an order or a verb of this shift"
            raise EntryError("code", code, "code-unknown", "is not known here", advice)
        kept = {"ORDER": order} if order is not None else {"MACHINE": machine}
        return replace(scanned, values={**scanned.values, **kept}), None

    def _named(self, scanned: _Scanned, name: str, value: str) -> _Scanned:
        if name == "WHO":
            return replace(scanned, who=value)
        read: Any = value
        if name in _WHOLE:
            read = whole(name.lower(), value)
        elif name == "LEFT":
            read = self._minutes(value)
        elif name == "AT":
            read = self._moment(value)
        return replace(scanned, values={**scanned.values, name: read})

    def _entry(self, kind: Kind, scanned: _Scanned) -> Entry:
        values = scanned.values
        data = {name.lower(): values[name] for name in ("GOOD", "SCRAP", "REASON") if name in values}
        if "LEFT" in values:
            data["left_s"] = values["LEFT"]
        if kind in _MACHINE_ONLY and "ORDER" in values:
            advice = "scan CLEAR, then the machine and the verb"
            raise EntryError("order", values["ORDER"], "not-wanted", f"says nothing for {kind}", advice)
        return checked(
            Entry(
                kind=kind,
                at_s=values.get("AT"),
                who=scanned.who,
                order=values.get("ORDER", ""),
                machine=values.get("MACHINE", self._machine),
                piece=values.get("PIECE", 0),
                unit=values.get("UNIT", 0),
                data=data,
            )
        )
