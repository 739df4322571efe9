"""What a recorder says, before it is known whether it can be: values are checked here, one by one."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field, replace
from typing import Any

from shopfloor import settings
from shopfloor.journal.errors import EntryError
from shopfloor.model.actuals import Event, Kind
from shopfloor.model.clock import DAY, MINUTE

MAX_HEADS = 10_000
MAX_MOMENT_S = 366 * DAY  # a shift's journal tells of a shift, not of years


@dataclass(frozen=True, slots=True)
class Entry:
    """One thing to record.

    Attributes
    ----------
    at_s
        When it happened, in seconds since the shift's start; None is now.
    piece, unit
        0 where the recorder leaves it to the journal to find the one that must be meant.
    corrects
        Number of the entry that this one replaces or, if ``withdrawn``, strikes out.
    id
        Given by the recorder so that a repeat is harmless; without one, equal entries are repeats.
    data
        By kind: ``reason`` (needed to stop and for a machine down); ``good``, ``scrap``; ``left_s``;
        ``heads``, ``pool``; ``operations`` as (machine, seconds), ``release_s``, ``due_s``, ``priority``;
        ``text``.
    """

    kind: Kind
    at_s: int | None = None
    who: str = ""
    order: str = ""
    machine: str = ""
    piece: int = 0
    unit: int = 0
    corrects: int = 0
    id: str = ""
    data: Mapping[str, Any] = field(default_factory=dict)


def derived_id(entry: Entry, at_s: int) -> str:
    """Return an id that equal entries share, whoever makes them."""
    when = 0 if entry.kind is Kind.WITHDRAWN else at_s
    facts = [
        entry.kind,
        when,
        entry.order,
        entry.machine,
        entry.piece,
        entry.unit,
        entry.corrects,
        entry.data,
    ]
    text = json.dumps(facts, sort_keys=True, ensure_ascii=True)
    return hashlib.sha256(text.encode("ascii")).hexdigest()[:16]


def repeats(entry: Entry, event: Event) -> bool:
    """Whether `entry` says again what `event` says; what it leaves open it does not contradict."""
    same = (entry.kind, entry.order, entry.machine, entry.corrects) == (
        event.kind,
        event.order,
        event.machine,
        event.corrects,
    )
    return (
        same
        and entry.at_s in (None, event.at_s)
        and entry.piece in (0, event.piece)
        and entry.unit in (0, event.unit)
        and plain(entry.data) == dict(event.data)
    )


def plain(data: Mapping[str, Any]) -> dict[str, Any]:
    """Return data as it comes back from the file: lists for tuples."""
    found: dict[str, Any] = json.loads(json.dumps(dict(data)))
    return found


# ---- values ------------------------------------------------------------------------------------------


def checked(entry: Entry) -> Entry:
    """Return `entry` with every value of a sound kind and size, blank ones left out.

    Raises
    ------
    EntryError
        For the first value that is not, or that its kind needs and has not.
    """
    needs, may = _FIELDS[entry.kind]
    data = {name: value for name, value in entry.data.items() if value is not None and value != ""}
    for name in data:
        if name not in may:
            raise EntryError(
                name, str(data[name]), "not-wanted", f"says nothing for {entry.kind}", "leave it out"
            )
    for name in ("order", "machine"):
        text = _name(name, getattr(entry, name))
        if text and entry.kind not in _NAMES[name]:
            raise EntryError(name, text, "not-wanted", f"says nothing for {entry.kind}", "leave it out")
    _name("who", entry.who)
    _name("id", entry.id)
    for name in ("piece", "unit", "corrects"):
        _whole(name, getattr(entry, name), settings.MAX_QUANTITY)
    if entry.at_s is not None and abs(entry.at_s) > MAX_MOMENT_S:
        raise EntryError(
            "at", str(entry.at_s), "at-far", "is more than a year from the shift", "check the date"
        )
    for name in needs:
        value = data.get(name) if name in may else getattr(entry, name)
        if value is None or value == "" or value == () or (name == "corrects" and not value):
            raise EntryError(
                name, "", f"{name}-missing", "is missing", _MISSING.get(name, f"give the {name}")
            )
    if entry.kind is Kind.CHANGED and not data:
        raise EntryError(
            "order", entry.order, "change-empty", "is not changed in any way", "give what is to change"
        )
    return replace(entry, data={name: _CHECKS[name](name, value) for name, value in sorted(data.items())})


def _name(field: str, text: str) -> str:
    return _text(field, text, settings.MAX_NAME_CHARACTERS)


def _words(field: str, text: str) -> str:
    return _text(field, text, settings.MAX_CELL_CHARACTERS)


def _text(field: str, text: str, limit: int) -> str:
    if not text.isprintable():
        bad = next(c for c in text if not c.isprintable())
        shown = "".join(c if c.isprintable() else "?" for c in text)[:40]
        raise EntryError(
            field, shown, "control-character", f"holds an invisible character (U+{ord(bad):04X})", "delete it"
        )
    if len(text) > limit:
        raise EntryError(
            field,
            text[:40] + "…",
            f"{field}-too-long",
            f"has {len(text)} characters, more than {limit}",
            "shorten it",
        )
    return text


def _whole(field: str, value: Any, limit: int) -> int:
    if not isinstance(value, int) or isinstance(value, bool) or not 0 <= value <= limit:
        raise EntryError(
            field,
            str(value)[:40],
            f"{field}-unusable",
            f"is no whole number from 0 to {limit:,}",
            "correct it",
        )
    return value


def _count(field: str, value: Any) -> int:
    return _whole(field, value, settings.MAX_QUANTITY)


def _heads(field: str, value: Any) -> int:
    return _whole(field, value, MAX_HEADS)


def _left(field: str, value: Any) -> int:
    return _whole(field, value, settings.MAX_MINUTES * MINUTE)


def _moment(field: str, value: Any) -> int:
    if not isinstance(value, int) or abs(value) > MAX_MOMENT_S:
        raise EntryError(
            field, str(value)[:40], f"{field}-far", "is more than a year from the shift", "check the date"
        )
    return value


def _priority(field: str, value: Any) -> float:
    if not isinstance(value, int | float) or not 0 < value <= settings.MAX_PRIORITY:
        raise EntryError(
            field,
            str(value)[:40],
            "priority-unusable",
            f"is no number above 0 and up to {settings.MAX_PRIORITY:,}",
            "correct it",
        )
    return float(value)


def _operations(field: str, value: Any) -> list[tuple[str, int]]:
    found: list[tuple[str, int]] = []
    for machine, seconds in value:
        if not machine:
            raise EntryError("machine", "", "machine-missing", "is missing", _MISSING["machine"])
        limit = settings.MAX_MINUTES * MINUTE
        if not isinstance(seconds, int) or not 0 < seconds <= limit:
            raise EntryError(
                "minutes",
                str(seconds)[:40],
                "minutes-unusable",
                "is no time above zero",
                "write minutes, or h:mm",
            )
        found.append((_name("machine", machine), seconds))
    return found


_CHECKS: Mapping[str, Callable[[str, Any], Any]] = {
    "reason": _words,
    "text": _words,
    "good": _count,
    "scrap": _count,
    "left_s": _left,
    "heads": _heads,
    "pool": _name,
    "operations": _operations,
    "release_s": _moment,
    "due_s": _moment,
    "priority": _priority,
}
_MISSING = {
    "order": "give the order",
    "machine": "give the machine",
    "reason": "say why in a few words",
    "left_s": "give the minutes that are left",
    "heads": "give the number of people present",
    "operations": "give at least one machine with its minutes, such as CMM=25",
    "text": "give the remark",
    "corrects": "give the number of the entry that is wrong",
}
_WORK = frozenset({Kind.STARTED, Kind.STOPPED, Kind.RESUMED, Kind.FINISHED, Kind.LEFT, Kind.REMARK})
_NAMES = {
    "order": _WORK | {Kind.ADDED, Kind.CHANGED, Kind.CANCELLED},
    "machine": _WORK | {Kind.DOWN, Kind.UP},
}
_ORDER_DATA = frozenset({"operations", "release_s", "due_s", "priority"})
# What each kind needs, and which data it may carry.
_FIELDS: Mapping[Kind, tuple[tuple[str, ...], frozenset[str]]] = {
    Kind.STARTED: (("order", "machine"), frozenset({"left_s"})),
    Kind.STOPPED: (("order", "machine", "reason"), frozenset({"reason", "left_s"})),
    Kind.RESUMED: (("order", "machine"), frozenset({"left_s"})),
    Kind.FINISHED: (("order", "machine"), frozenset({"good", "scrap"})),
    Kind.LEFT: (("order", "machine", "left_s"), frozenset({"left_s"})),
    Kind.DOWN: (("machine", "reason"), frozenset({"reason"})),
    Kind.UP: (("machine",), frozenset()),
    Kind.CREW: (("heads",), frozenset({"heads", "pool"})),
    Kind.ADDED: (("order", "operations"), _ORDER_DATA),
    Kind.CHANGED: (("order",), _ORDER_DATA),
    Kind.CANCELLED: (("order",), frozenset({"reason"})),
    Kind.REMARK: (("text",), frozenset({"text"})),
    Kind.WITHDRAWN: (("corrects",), frozenset({"reason"})),
}
