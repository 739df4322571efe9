"""[[machine]] and [[crew]] of shop.toml: read as written, and put on the clock once it is known."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field, replace

from shopfloor.model.calendar import Clock
from shopfloor.model.shop import Closure, Crew, Machine
from shopfloor.read.cells import MAX_HEADS
from shopfloor.read.document import Document, Table
from shopfloor.read.headers import Suggestions, loose
from shopfloor.read.rules import Findings, Place
from shopfloor.read.spans import (
    Stretch,
    Timed,
    ahead,
    apart,
    merged,
    outside,
    stretch_of,
    stretches,
    timed,
)

MAX_UNITS = 10_000
MACHINE_KEYS = (
    "id", "name", "count", "pauses", "open", "closed", "crew", "heads", "attended", "setup_minutes", "family",
)  # fmt: skip
CREW_KEYS = ("id", "heads", "levels")
_LEVEL = '{ from = "12:00", to = "12:30", heads = 3 }'


@dataclass(frozen=True, slots=True)
class MachineSaid:
    """One ``[[machine]]``: all but its times, its times as written, and the defaults of its rows.

    `open` is None where nothing is known about opening hours. `heads` and `setup_s` stand for rows that leave
    their columns blank. `places` knows where each key stands.
    """

    machine: Machine
    place: Place
    closed: tuple[Stretch, ...] = ()
    open: tuple[Stretch, ...] | None = None
    heads: int = 1
    setup_s: int = 0
    places: dict[str, Place] = field(default_factory=dict)

    def on(self, clock: Clock | None, findings: Findings) -> Machine:
        """Return the machine with its closures on the clock."""
        closed = merged(closures(timed(self.closed, clock, findings)))
        if self.open is not None and clock is not None:
            before = findings.count
            openings = [ahead(one.start_s, one.end_s) for one in timed(self.open, clock, findings)]
            later = [opening for opening in openings if opening is not None]
            if later:
                closed = merged([*closed, *outside(later, closed)])
            elif findings.count == before:
                findings.fault(self.places["open"], "never-open", self.machine.id)
        return replace(self.machine, closed=closed)


@dataclass(frozen=True, slots=True)
class CrewSaid:
    """One ``[[crew]]`` with its levels as written."""

    id: str
    heads: int
    place: Place
    levels: tuple[Stretch, ...] = ()

    def on(self, clock: Clock | None, end_s: int | None, findings: Findings) -> Crew:
        """Return the crew with its levels on the clock; notice those that lie outside the shift."""
        levels: list[tuple[int, int, int]] = []
        for one in apart(timed(self.levels, clock, findings), "levels-overlap", findings):
            level = ahead(one.start_s, one.end_s)
            if level is None or (end_s is not None and one.start_s >= end_s):
                findings.notice(one.said.start.place, "level-outside", one.said.start.text, crew=self.id)
            if level is not None:
                levels.append((*level, one.said.heads))
        return Crew(self.id, self.heads, tuple(levels))


def closures(found: Iterable[Timed]) -> list[Closure]:
    """Return stretches as closures, without those that are over before the shift."""
    spans = ((ahead(one.start_s, one.end_s), one.said.reason) for one in found)
    return [Closure(*span, reason) for span, reason in spans if span is not None]


# ---- reading --------------------------------------------------------------------------------------


def read_machines(document: Document) -> tuple[tuple[MachineSaid, ...], bool]:
    """Read every ``[[machine]]``; also tell whether all of them have a sound id."""
    machines: dict[str, MachineSaid] = {}
    sound = True
    for table in document.tables(document.tree, "machine", MACHINE_KEYS):
        said = _machine(document, table) if table is not None else None
        if said is None:
            sound = False
        elif said.machine.id in machines:
            first = machines[said.machine.id].place.row
            document.findings.fault(said.place, "machine-duplicate", said.machine.id, row=first)
        else:
            machines[said.machine.id] = said
    return tuple(machines.values()), sound


def _machine(document: Document, table: Table) -> MachineSaid | None:
    """Read one ``[[machine]]``; None when it has no sound id."""
    name = document.name(table, "id", needed_by="[[machine]]")
    machine = Machine(
        name,
        document.name(table, "name"),
        document.whole(table, "count", 1, MAX_UNITS, "count-unusable") or 1,
        pauses=document.truth(table, "pauses"),
        crew=document.name(table, "crew") or None,
        set_up_only=_set_up_only(document, table),
        family=document.name(table, "family") or None,
    )
    heads = document.whole(table, "heads", 0, MAX_HEADS, "heads-unusable")
    said = MachineSaid(
        machine,
        document.at(*table.path, "id"),
        stretches(document, table, "closed"),
        _openings(document, table),
        1 if heads is None else heads,
        document.minutes(table, "setup_minutes") or 0,
        {key: document.at(*table.path, key) for key in table.values},
    )
    return said if name else None


def _openings(document: Document, table: Table) -> tuple[Stretch, ...] | None:
    """Read the opening hours; None where there are none, or where a fault hides some."""
    before = document.findings.count
    found = stretches(document, table, "open")
    return found if "open" in table.values and document.findings.count == before else None


def _set_up_only(document: Document, table: Table) -> bool:
    """Read whether the crew attends only set-ups."""
    value, place = table.values.get("attended", "always"), document.at(*table.path, "attended")
    if not document.kind(value, (str,), place, '"always" or "set-up"'):
        return False
    if loose(value) not in {"always", "setup"}:
        document.findings.fault(place, "attended-unknown", value)
    return loose(value) == "setup"


def read_crews(document: Document) -> tuple[tuple[CrewSaid, ...], bool]:
    """Read every ``[[crew]]``; also tell whether all of them have a sound id."""
    crews: dict[str, CrewSaid] = {}
    sound = True
    for table in document.tables(document.tree, "crew", CREW_KEYS):
        if table is None:
            sound = False
            continue
        name = document.name(table, "id", needed_by="[[crew]]")
        place = document.at(*table.path, "id")
        if "heads" not in table.values:
            document.findings.fault(document.at(*table.path, "heads"), "key-missing", table="[[crew]]")
        heads = document.whole(table, "heads", 0, MAX_HEADS, "heads-unusable") or 0
        levels = _levels(document, table)
        if not name:
            sound = False
        elif name in crews:
            document.findings.fault(place, "crew-duplicate", name, row=crews[name].place.row)
        else:
            crews[name] = CrewSaid(name, heads, place, levels)
    return tuple(crews.values()), sound


def _levels(document: Document, inside: Table) -> tuple[Stretch, ...]:
    found: list[Stretch] = []
    for table in document.tables(inside, "levels", ("from", "to", "heads"), _LEVEL):
        if table is None:
            continue
        stretch = stretch_of(document, table)
        if "heads" not in table.values:
            document.findings.fault(document.at(*table.path, "heads"), "key-missing", table="entry of levels")
        heads = document.whole(table, "heads", 0, MAX_HEADS, "heads-unusable")
        if stretch is not None and heads is not None:
            found.append(replace(stretch, heads=heads))
    return tuple(found)


# ---- what one table says of another ---------------------------------------------------------------


def check_names(
    machines: Iterable[MachineSaid], crews: Sequence[CrewSaid], crews_known: bool, findings: Findings
) -> None:
    """Report crews that are named but not listed; notice what counts for nothing."""
    listed = Suggestions(crew.id for crew in crews)
    wanted: set[str] = set()
    for said in machines:
        crew = said.machine.crew
        if crew is not None:
            wanted.add(crew)
            if crews_known and crew not in listed.among:
                findings.fault(said.places["crew"], "crew-unknown", crew, nearest=listed.hint(crew))
        elif "crew" not in said.places:
            for key in ("heads", "attended"):
                if key in said.places:
                    findings.notice(said.places[key], "machine-without-crew", said.machine.id, key=key)
    for listing in crews:
        if listing.id not in wanted:
            findings.notice(listing.place, "crew-idle", listing.id, crew=listing.id)
