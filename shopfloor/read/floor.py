"""shop.toml as a whole: the shift, the hall, and the headers of an ERP's export."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import datetime, time
from zoneinfo import ZoneInfo, available_timezones

from shopfloor.model.calendar import Clock
from shopfloor.model.shop import Changeovers, Closure, Crew, Machine, Transport
from shopfloor.read.between import Betweens, read_betweens, report_unknown_machines
from shopfloor.read.columns import COLUMNS
from shopfloor.read.document import Document, Table, parse
from shopfloor.read.hall import CrewSaid, MachineSaid, check_names, closures, read_crews, read_machines
from shopfloor.read.headers import Suggestions, loose
from shopfloor.read.rules import Findings
from shopfloor.read.shift import Moment, Said, Shift, settle, written
from shopfloor.read.source import Readable, take
from shopfloor.read.spans import Stretch, apart, stretches, timed

MAX_FLOOR_BYTES = 256 * 1024
_TABLES = ("shift", "machine", "crew", "changeover", "transport", "columns")
_SHIFT = ("start", "end", "zone", "breaks")


@dataclass(frozen=True)
class Draft:
    """What shop.toml says, as far as it could be read beside its faults; its times are not yet on a clock.

    `shift_known`, `machines_known` and `crews_known` are false where a fault hides part of what is meant.
    """

    file: str = "shop.toml"
    shift: Shift = field(default_factory=Shift)
    breaks: tuple[Stretch, ...] = ()
    machines: tuple[MachineSaid, ...] = ()
    crews: tuple[CrewSaid, ...] = ()
    betweens: Betweens = field(default_factory=Betweens)
    columns: Mapping[str, str] = field(default_factory=dict)
    inputs: tuple[tuple[str, str], ...] = ()
    shift_known: bool = True
    machines_known: bool = True
    crews_known: bool = True

    def on(self, clock: Clock | None, shift_end_s: int | None, findings: Findings) -> Floor:
        """Return the floor with its times on the clock; times and names that cannot be used become faults.

        Without a clock, because the shift itself is in doubt, times are left out: one
        fault shall not make many.
        """
        check_names(self.machines, self.crews, self.crews_known, findings)
        if self.machines and self.machines_known:
            report_unknown_machines(self.betweens, [said.machine.id for said in self.machines], findings)
        transport = self.betweens.transport
        pauses = apart(timed(self.breaks, clock, findings), "breaks-overlap", findings)
        return Floor(
            clock=clock or Clock(),
            shift_end_s=shift_end_s,
            breaks=tuple(closures(pauses)),
            machines=tuple(said.on(clock, findings) for said in self.machines),
            crews=tuple(said.on(clock, shift_end_s, findings) for said in self.crews),
            changeovers={machine: said.times for machine, said in self.betweens.changeovers.items()},
            transport=Transport() if transport is None else transport.times,
            heads={said.machine.id: said.heads for said in self.machines},
            setup_s={said.machine.id: said.setup_s for said in self.machines},
            columns=self.columns,
            inputs=self.inputs,
            draft=self,
        )


@dataclass(frozen=True)
class Floor:
    """What shop.toml says; made by :func:`load_floor`.

    Attributes
    ----------
    clock, shift_end_s, breaks
        From ``[shift]``.
    machines
        In the order of the file; empty when none are listed, and then any machine may stand in the orders.
    crews, changeovers, transport
        As a shop holds them.
    heads, setup_s
        By machine id: what stands for a row that leaves its column blank.
    columns
        Our column name to the header in an ERP's export.
    inputs
        Name and SHA-256 of the file.
    draft
        The same as it was written, so that a start or an end given elsewhere can move it.
    """

    clock: Clock = field(default_factory=Clock)
    shift_end_s: int | None = None
    breaks: tuple[Closure, ...] = ()
    machines: tuple[Machine, ...] = ()
    crews: tuple[Crew, ...] = ()
    changeovers: Mapping[str, Changeovers] = field(default_factory=dict)
    transport: Transport = field(default_factory=Transport)
    heads: Mapping[str, int] = field(default_factory=dict)
    setup_s: Mapping[str, int] = field(default_factory=dict)
    columns: Mapping[str, str] = field(default_factory=dict)
    inputs: tuple[tuple[str, str], ...] = ()
    draft: Draft = field(default_factory=Draft)


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
        With every fault of the file: TOML that cannot be read, unknown keys and names (with the nearest known
        one), values of the wrong kind, times that cannot be used.
    """
    findings = Findings()
    draft = read_floor(source, findings, name=name)
    floor, _ = put_on_clock(draft, findings)
    findings.stop_if_any()
    return floor


def put_on_clock(
    draft: Draft, findings: Findings, start: Moment | None = None, end: Moment | None = None
) -> tuple[Floor, bool]:
    """Return the floor of a draft on its clock, and whether the clock could be told.

    `start` and `end` go before what the file says of the shift.
    """
    settled = settle(draft.shift.overruled(start, end), findings)
    clock, end_s = settled if settled is not None and draft.shift_known else (None, None)
    return draft.on(clock, end_s, findings), clock is not None


def read_floor(source: Readable, findings: Findings, *, name: str | None = None) -> Draft:
    """Read shop.toml, adding its faults to `findings`, and return what is sound.

    Raises
    ------
    InputError
        Only if the file cannot be opened, is no UTF-8, or is not valid TOML.
    """
    taken = take(source, name=name, limit=MAX_FLOOR_BYTES)
    document = parse(taken, findings)
    document.known(document.tree, _TABLES)
    shift, breaks, shift_known = _shift(document)
    machines, machines_known = read_machines(document)
    crews, crews_known = read_crews(document)
    betweens = read_betweens(document)
    return Draft(
        taken.name,
        shift,
        breaks,
        machines,
        crews,
        betweens,
        _columns(document),
        ((taken.name, taken.sha256),),
        shift_known,
        machines_known,
        crews_known,
    )


def _shift(document: Document) -> tuple[Shift, tuple[Stretch, ...], bool]:
    """Read ``[shift]``; also tell whether its start, end and zone are of the right kind."""
    table, sound = document.table(document.tree, "shift", None)
    document.known(table, _SHIFT)
    said: dict[str, Said] = {}
    for key, kinds, words in (
        ("start", (str, datetime), 'a date and time such as "2026-03-02T06:00"'),
        ("end", (str, datetime, time), 'a time such as "14:00"'),
    ):
        if key in table.values:
            at = document.at("shift", key)
            if document.kind(table.values[key], kinds, at, words):
                said[key] = Said(written(table.values[key]), at)
            else:
                sound = False
    zone, zone_known = _zone(document, table)
    shift = Shift(said.get("start"), said.get("end"), zone)
    return shift, stretches(document, table, "breaks"), sound and zone_known


def _zone(document: Document, table: Table) -> tuple[ZoneInfo | None, bool]:
    at = document.at("shift", "zone")
    if "zone" not in table.values:
        return None, True
    name = table.values["zone"]
    if not document.kind(name, (str,), at, 'a text such as "Europe/London"'):
        return None, False
    try:
        return ZoneInfo(name), True
    except (KeyError, ValueError, OSError):  # unknown, no name at all, or the name of a folder of zones
        near = Suggestions(sorted(available_timezones()))
        document.findings.fault(at, "zone-unknown", name, nearest=near.hint(name))
        return None, False


def _columns(document: Document) -> dict[str, str]:
    """Read ``[columns]``: our name = "their header"."""
    table, _ = document.table(document.tree, "columns", COLUMNS)
    mapped: dict[str, str] = {}
    for name, header in table.values.items():
        at = document.at("columns", name)
        if name not in COLUMNS or not document.kind(
            header, (str,), at, 'a header in quotes, such as "Work Order No"'
        ):
            continue
        other = next((ours for ours, theirs in mapped.items() if loose(theirs) == loose(header)), None)
        if other is not None:
            document.findings.fault(at, "header-mapped-twice", header, name=other)
        elif loose(header):
            mapped[name] = header.strip()
        else:
            document.findings.fault(at, "header-empty", header)
    return mapped
