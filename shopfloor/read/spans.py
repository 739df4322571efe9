"""Stretches of time in shop.toml, such as breaks: read as they are written, and put on the clock later.

The start of the shift may come from the command line, so the clock is known only after the whole file.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from datetime import datetime, time, timedelta

from shopfloor.model.calendar import Clock, united
from shopfloor.model.feasible import FOR_GOOD_S
from shopfloor.model.shop import Closure
from shopfloor.read.cells import CellFault, moment
from shopfloor.read.document import Document, Table
from shopfloor.read.rules import Findings
from shopfloor.read.shift import Said, has_offset, written

NOT_OPEN = "not open"
EXAMPLE = '{ from = "09:00", to = "09:15" }'


@dataclass(frozen=True, slots=True)
class Stretch:
    """A stretch of time as somebody wrote it, with what goes with it."""

    start: Said
    end: Said
    reason: str = ""
    heads: int = 0


@dataclass(frozen=True, slots=True)
class Timed:
    """A stretch of time in seconds since the shift's start, and what it was made from."""

    start_s: int
    end_s: int
    said: Stretch


def stretch_of(document: Document, table: Table) -> Stretch | None:
    """Return the stretch that a table's `from`, `to` and `reason` tell, or None where they are a fault."""
    start, end = _said(document, table, "from"), _said(document, table, "to")
    reason = document.name(table, "reason")
    return Stretch(start, end, reason) if start is not None and end is not None else None


def _said(document: Document, table: Table, key: str) -> Said | None:
    place = document.at(*table.path, key)
    value = table.values.get(key)
    if value is None:
        document.findings.fault(place, "key-missing", table=f"entry of {table.path[-2]}")
        return None
    if not document.kind(value, (str, datetime, time), place, 'a time such as "14:00"'):
        return None
    return Said(written(value), place)


def stretches(document: Document, inside: Table, key: str) -> tuple[Stretch, ...]:
    """Read a list of stretches with reasons."""
    tables = document.tables(inside, key, ("from", "to", "reason"), EXAMPLE)
    found = (stretch_of(document, table) for table in tables if table is not None)
    return tuple(stretch for stretch in found if stretch is not None)


# ---- on the clock ---------------------------------------------------------------------------------


def timed(said: Iterable[Stretch], clock: Clock | None, findings: Findings) -> list[Timed]:
    """Put stretches on the clock and in order of time; those whose times cannot be used become faults.

    Without a clock there are none.
    """
    found: list[Timed] = []
    for stretch in said if clock is not None else ():
        assert clock is not None
        start, end = (
            _moment(stretch.start, clock, "from", findings),
            _moment(stretch.end, clock, "to", findings),
        )
        if start is None or end is None:
            continue
        if end == 0 and clock.start is not None and "-" not in stretch.end.text:
            end = clock.seconds(clock.start + timedelta(days=1))  # until the same time on the next day
        if end > start:
            found.append(Timed(start, end, stretch))
        else:
            findings.fault(
                stretch.end.place,
                "to-not-after-from",
                stretch.end.text,
                first=stretch.start.text,
                why=_past_midnight(stretch.start, start, clock),
            )
    return sorted(found, key=lambda one: (one.start_s, one.end_s))


def _moment(said: Said, clock: Clock, key: str, findings: Findings) -> int | None:
    text = said.text.strip()
    if has_offset(text):
        findings.fault(said.place, "offset-not-allowed", text)
        return None
    try:
        return moment(text, clock, key)
    except CellFault as fault:
        findings.fault(said.place, fault.rule, text, **fault.words)
        return None


def _past_midnight(said: Said, seconds: int, clock: Clock) -> str:
    """Explain how a time of day came to be late, where the clock has made it so."""
    if clock.start is None or "-" in said.text or clock.moment(seconds).date() == clock.start.date():
        return ""
    return f" (a time of day before the shift's start, {clock.say(0)}, is past midnight)"


def apart(stretches: Sequence[Timed], rule: str, findings: Findings) -> list[Timed]:
    """Return stretches in order of time without those that overlap an earlier one; they become faults."""
    kept: list[Timed] = []
    for one in stretches:
        if kept and one.start_s < kept[-1].end_s:
            place, text, last = one.said.start.place, one.said.start.text, kept[-1].said
            findings.fault(place, rule, text, start=last.start.text, end=last.end.text)
        else:
            kept.append(one)
    return kept


def ahead(start_s: int, end_s: int) -> tuple[int, int] | None:
    """Return what of a stretch lies in the shift or after it, or None when it is over before."""
    return (max(0, start_s), end_s) if end_s > 0 else None


def merged(closures: Iterable[Closure]) -> tuple[Closure, ...]:
    """Return closures in order of time and apart from each other; those that overlap become one."""
    out: list[Closure] = []
    for closure in sorted(closures, key=lambda one: (one.start_s, one.end_s, one.reason)):
        if out and closure.start_s < out[-1].end_s:
            last = out.pop()
            reasons = dict.fromkeys(reason for reason in (last.reason, closure.reason) if reason)
            closure = Closure(last.start_s, max(last.end_s, closure.end_s), ", ".join(reasons))
        out.append(closure)
    return tuple(out)


def outside(openings: Sequence[tuple[int, int]], closed: Sequence[Closure]) -> list[Closure]:
    """Return when a machine is not open, as far as no closure says so with a reason of its own.

    Parameters
    ----------
    openings
        Start and end of each, in any order; there must be some.
    closed
        In order of time and apart from each other.
    """
    edges = united(openings)
    begins = [0, *(end for _, end in edges)]
    ends = [*(start for start, _ in edges), edges[-1][1] + FOR_GOOD_S]
    found: list[Closure] = []
    for begin, end in zip(begins, ends, strict=True):
        for closure in closed:
            if begin < closure.start_s < end:
                found.append(Closure(begin, closure.start_s, NOT_OPEN))
            if closure.start_s < end:
                begin = max(begin, closure.end_s)
        if begin < end:
            found.append(Closure(begin, end, NOT_OPEN))
    return found
