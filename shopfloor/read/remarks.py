"""What is no fault of an orders file but worth saying: repeats, look-alikes, and what counts for nothing."""

from __future__ import annotations

import unicodedata
from collections.abc import Iterable

import numpy as np

from shopfloor.model.shop import Ints, Machine, Shop
from shopfloor.read.between import notice_unused_families, notice_unvisited
from shopfloor.read.columns import COLUMNS, Sheet
from shopfloor.read.floor import Floor
from shopfloor.read.headers import Suggestions
from shopfloor.read.rows import NOBODY
from shopfloor.read.rules import Findings, count_of


def notice_alike(sheet: Sheet, names: tuple[str, ...], machine: Ints) -> None:
    """Notice machines whose names differ only by case, spaces or punctuation."""
    named = np.flatnonzero(machine != NOBODY)
    rows = named[np.unique(machine[named], return_index=True)[1]]  # where each machine first stands
    first: dict[str, int] = {}
    for number, name in enumerate(names):
        folded = unicodedata.normalize("NFKC", name).casefold()
        key = "".join(filter(str.isalnum, folded)) or folded
        other = first.setdefault(key, number)
        if other != number:
            place, row = sheet.place(rows[number], "machine"), sheet.row(rows[other])
            sheet.findings.notice(place, "machines-alike", name, other=names[other], row=row)


def notice_repeated(
    sheet: Sheet, orders: tuple[str, ...], job: Ints, machines: tuple[Machine, ...], machine: Ints
) -> None:
    """Notice rows that send an order to a machine where another row has sent it."""
    known = np.flatnonzero((job != NOBODY) & (machine != NOBODY))
    _, first, which = np.unique(
        job[known] * max(1, len(machines)) + machine[known], return_index=True, return_inverse=True
    )
    again = first[which] != np.arange(len(known))
    if not again.any():
        return
    row = int(again.argmax())
    sheet.findings.notice(
        sheet.table.place.whole,
        "visit-repeated",
        count=count_of(int(again.sum()), "row sends", "rows send"),
        earlier=sheet.row(int(known[first[which[row]]])),
        row=sheet.row(int(known[row])),
        order=orders[job[known[row]]],
        machine=machines[machine[known[row]]].id,
    )


def notice_idle(sheet: Sheet, floor: Floor, crew: int | None) -> None:
    """Notice columns that are filled in although nothing makes them count."""
    counts = {"[[crew]]": bool(floor.crews) or crew is not None, "[changeover]": bool(floor.changeovers)}
    for name in sheet.positions:
        table = COLUMNS[name].idle_without
        if table and not counts[table] and name in sheet and bool(sheet[name].given.any()):
            place = sheet.table.at(sheet.table.place.row, sheet.positions[name])
            sheet.findings.notice(place, "column-idle", place.column, table=table)


def notice_unlisted(floor: Floor, machines: Iterable[Machine], findings: Findings) -> None:
    """Notice machines that only the times between things name, where the orders alone tell the machines."""
    if not floor.machines:
        notice_unvisited(floor.draft.betweens, [machine.id for machine in machines], findings)


def notice_hall(floor: Floor, shop: Shop, findings: Findings) -> None:
    """Notice what shop.toml says of machines, with these orders, to no effect.

    Parameters
    ----------
    shop
        The rows that are sound.
    """
    operations = shop.operations
    set_up = np.bincount(operations.machine, operations.setup_s, len(shop.machines)) > 0
    visited = np.bincount(operations.machine, minlength=len(shop.machines)) > 0
    places = {said.machine.id: said.places for said in floor.draft.machines}
    width = len(shop.families) + 1  # a last place for no family, which is -1
    pairs = np.unique(operations.machine * width + operations.family % width)
    for index, machine in enumerate(shop.machines):
        first, last = np.searchsorted(pairs, [index * width, (index + 1) * width - 1])
        families = [shop.families[pair % width] for pair in pairs[first:last].tolist()]
        said, mine = floor.draft.betweens.changeovers.get(machine.id), places.get(machine.id, {})
        if said is not None and visited[index]:
            notice_unused_families(said, machine.id, families, findings)
        if machine.family is not None:
            if said is None:
                place = mine["family"]
                findings.notice(place, "family-without-changeover", machine.family, machine=machine.id)
            elif visited[index] and machine.family not in {*families, *(side.name for side in said.sides)}:
                near = Suggestions(families).hint(machine.family)
                findings.notice(
                    mine["family"], "family-idle", machine.family, machine=machine.id, nearest=near
                )
        if machine.set_up_only and machine.crew is not None and visited[index] and not set_up[index]:
            findings.notice(mine["attended"], "set-up-only-idle", machine.id)
