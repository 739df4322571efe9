"""[changeover.MACHINE] and [transport] of shop.toml: minutes from one thing to another."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Mapping
from dataclasses import dataclass, field
from typing import Generic, TypeVar

from shopfloor.errors import ShopError
from shopfloor.model.shop import Changeovers, Transport
from shopfloor.read.document import Document, Table
from shopfloor.read.headers import Suggestions
from shopfloor.read.rules import Findings, Place

MAX_NAMES = 50  # in the pairs of one table: that no way round is shorter is checked over all threes of them
MAX_NAMES_IN_ALL = 500
_PAIR = '{ from = "red", to = "black", minutes = 15 }'
_WAY = '{ from = "WASH", to = "CMM", minutes = 10 }'

_T = TypeVar("_T", Changeovers, Transport)


@dataclass(frozen=True, slots=True)
class Side:
    """A name in a pair, and where it stands."""

    name: str
    place: Place


@dataclass(frozen=True)
class BetweenSaid(Generic[_T]):
    """One table of times between things, and the names in it for whoever knows what they should be."""

    times: _T
    place: Place
    sides: tuple[Side, ...] = ()


@dataclass(frozen=True)
class Betweens:
    """All times between things: changeovers by machine, and transport."""

    changeovers: Mapping[str, BetweenSaid[Changeovers]] = field(default_factory=dict)
    transport: BetweenSaid[Transport] | None = None


def read_betweens(document: Document) -> Betweens:
    """Read every ``[changeover.MACHINE]`` and ``[transport]``."""
    top, _ = document.table(document.tree, "changeover", None)
    left = MAX_NAMES_IN_ALL
    changeovers = {}
    for machine in top.values:
        table, _ = document.table(top, machine, ("between", "pairs"))
        most = max(0, min(left, MAX_NAMES))
        said = changeovers[machine] = _between(document, table, machine, Changeovers, _PAIR, most)
        left -= len({side.name for side in said.sides})
    if "transport" not in document.tree.values:
        return Betweens(changeovers)
    table, _ = document.table(document.tree, "transport", ("between", "pairs"))
    return Betweens(changeovers, _between(document, table, "transport", Transport, _WAY, MAX_NAMES))


def _between(
    document: Document,
    table: Table,
    name: str,
    build: Callable[[int, Mapping[tuple[str, str], int]], _T],
    example: str,
    most: int,
) -> BetweenSaid[_T]:
    place = document.at(*table.path)
    between = document.minutes(table, "between") or 0
    pairs: dict[tuple[str, str], int] = {}
    sides: list[Side] = []
    before = document.findings.count
    for entry in document.tables(table, "pairs", ("from", "to", "minutes"), example):
        if entry is None:
            continue
        one, two = (document.name(entry, key, needed_by="pair") for key in ("from", "to"))
        if "minutes" not in entry.values:
            document.findings.fault(document.at(*entry.path, "minutes"), "key-missing", table="pair")
        seconds = document.minutes(entry, "minutes")
        if not one or not two:
            continue
        sides += [Side(one, document.at(*entry.path, "from")), Side(two, document.at(*entry.path, "to"))]
        shown = f"{one} to {two}"
        if one == two:
            document.findings.fault(document.at(*entry.path), "pair-to-itself", shown)
        elif (one, two) in pairs:
            document.findings.fault(document.at(*entry.path), "pair-twice", shown)
        elif seconds is not None:
            pairs[one, two] = seconds
    names = len({side.name for side in sides})
    if names > most:
        document.findings.fault(place, "too-many-names", name, count=names, limit=most)
    if document.findings.count > before:  # half of the pairs would look like contradictions that are none
        return BetweenSaid(build(0, {}), place, tuple(sides))
    try:
        return BetweenSaid(build(between, pairs), place, tuple(sides))
    except ShopError as error:  # the home of the rule is the model
        problem, _, advice = str(error).partition("; ")
        if "between" in table.values:
            document.findings.fault(place, "way-round-shorter", name, problem=problem, advice=advice)
        else:
            at = document.at(*table.path, "between")
            document.findings.fault(at, "between-missing", problem=problem)
        return BetweenSaid(build(0, {}), place, tuple(sides))


# ---- what they name -------------------------------------------------------------------------------


def machines_named(betweens: Betweens) -> Iterator[Side]:
    """Yield every machine that the tables name, and where."""
    for machine, said in betweens.changeovers.items():
        yield Side(machine, said.place)
    if betweens.transport is not None:
        yield from betweens.transport.sides


def report_unknown_machines(betweens: Betweens, machines: Iterable[str], findings: Findings) -> None:
    """Report machines that the tables name and shop.toml does not list."""
    near = Suggestions(machines)
    for side in machines_named(betweens):
        if side.name not in near.among:
            findings.fault(side.place, "machine-not-listed", side.name, nearest=near.hint(side.name))


def notice_unvisited(betweens: Betweens, machines: Iterable[str], findings: Findings) -> None:
    """Notice machines that the tables name and no row visits, where shop.toml lists no machines."""
    near = Suggestions(machines)
    for side in machines_named(betweens):
        if side.name not in near.among:
            findings.notice(side.place, "machine-not-visited", side.name, nearest=near.hint(side.name))


def notice_unused_families(
    said: BetweenSaid[Changeovers], machine: str, families: Iterable[str], findings: Findings
) -> None:
    """Notice families of one machine's changeovers that no row on it has, with what may be meant."""
    near = Suggestions(families)
    unused = list(dict.fromkeys(side.name for side in said.sides if side.name not in near.among))
    if not near.among:
        findings.notice(said.place, "changeover-idle", machine)
    elif unused:
        shown = [_meant(name, near.nearest(name)) for name in unused[:6]]
        more = [f"{len(unused) - 6:,} more"] if len(unused) > 6 else []
        findings.notice(said.place, "families-not-used", machine, names=", ".join([*shown, *more]))


def _meant(name: str, close: str | None) -> str:
    return f"{name!r} (is {close!r} meant?)" if close else repr(name)
