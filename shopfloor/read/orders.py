"""The orders file: rows of text become a shop, or the complete list of what is wrong with them."""

from __future__ import annotations

import unicodedata
from dataclasses import dataclass
from fractions import Fraction
from typing import TYPE_CHECKING, Any

import numpy as np

from shopfloor import settings
from shopfloor.errors import InputError
from shopfloor.model.calendar import MINUTE, Clock
from shopfloor.model.results import Fault
from shopfloor.model.shop import NO_DUE, NO_FAMILY, NO_STEP, Ints, Machine, Operations, Orders, Shop
from shopfloor.read.cells import find_marks
from shopfloor.read.columns import COLUMNS, How, Sheet
from shopfloor.read.floor import Draft, Floor, read_floor
from shopfloor.read.headers import Wanted, nearest
from shopfloor.read.match import match_columns
from shopfloor.read.rules import Findings, Place, count_of
from shopfloor.read.shift import Moment, settle
from shopfloor.read.source import Readable
from shopfloor.read.table import gather, open_table
from shopfloor.read.times import run_times

if TYPE_CHECKING:
    import pandas as pd

NEAREST_BUDGET = 50_000  # pairs of names compared to suggest a machine; beyond it nothing is suggested
NOBODY = -1  # a row whose order, machine or family is not known


@dataclass(frozen=True)
class Reading:
    """What an orders file holds.

    Attributes
    ----------
    shop
        Everything a plan is made from.
    notices
        What is no fault but worth saying, in file order.
    inputs
        Name and SHA-256 of each file read, the orders first.
    """

    shop: Shop
    notices: tuple[Fault, ...]
    inputs: tuple[tuple[str, str], ...]


def read_orders(
    source: Readable | pd.DataFrame,
    *,
    shop: Readable | Floor | None = None,
    start: Moment | None = None,
    end: Moment | None = None,
    round_minutes: float | None = None,
) -> Shop:
    """Read work orders into a shop; see :func:`load`, which also hands over the notices.

    Examples
    --------
    >>> read_orders(b"order,machine,minutes\\nTQ-1,WASH,30\\n").operation(0).seconds
    1800
    """
    return load(source, shop=shop, start=start, end=end, round_minutes=round_minutes).shop


def load(
    source: Readable | pd.DataFrame,
    *,
    shop: Readable | Floor | None = None,
    start: Moment | None = None,
    end: Moment | None = None,
    round_minutes: float | None = None,
    name: str | None = None,
) -> Reading:
    """Read an orders file, one row an operation, and what goes with it.

    Linear in the size of the file: each distinct text of a column is read once.

    Parameters
    ----------
    source
        Path, bytes or an open binary file holding CSV or XLSX, or a pandas DataFrame whose cells are read by
        the same rules (its row numbers count from 2, as if it had been a file).
    shop
        shop.toml as path, bytes or open file, or a :class:`Floor`; None when there is none.
    start, end
        Of the shift; they go before what shop.toml says.
    round_minutes
        Length of one round for a file without times; the setting `round` unless given.
    name
        What messages call `source`; otherwise the name of the file, ``<stdin>`` and the like.

    Returns
    -------
    Reading
        Machines in the order of shop.toml, or of first appearance when it lists none; orders in order of
        first appearance; operations in the order of the rows.

    Raises
    ------
    InputError
        With every fault of every row of both files, in file order: shop.toml, options, orders.
    """
    findings = Findings()
    draft = _floor(shop, findings)
    settled = settle(draft.floor.shift.overruled(start, end), findings)
    round_s = _round_seconds(round_minutes, findings)
    clock = settled[0] if settled is not None and draft.shift_known else None
    wanted = Wanted(tuple(COLUMNS), tuple(n for n, c in COLUMNS.items() if c.needed), draft.floor.columns)
    try:
        sheet = _sheet(source, wanted, findings, name)
    except InputError as error:
        findings.merge(error)
        raise InputError(findings.faults, findings.notices) from None
    _read_columns(sheet, clock)
    parts = _assemble(sheet, draft, round_s)
    findings.stop_if_any()
    assert settled is not None  # a shift that cannot be settled is a fault
    return Reading(
        shop=Shop(clock=settled[0], shift_end_s=settled[1], **parts),
        notices=findings.notices,
        inputs=((sheet.table.place.file, sheet.table.sha256), *draft.floor.inputs),
    )


def _floor(shop: Readable | Floor | None, findings: Findings) -> Draft:
    if shop is None:
        return Draft(Floor())
    if isinstance(shop, Floor):
        return Draft(shop)
    try:
        return read_floor(shop, findings)
    except InputError as error:
        findings.merge(error)
        return Draft(Floor(), shift_known=False, machines_known=False)


def _round_seconds(minutes: float | None, findings: Findings) -> int:
    """Return the seconds of one round; 1 where that is a fault."""
    said = settings.default("round") if minutes is None else minutes
    try:
        seconds = Fraction(str(said)) * MINUTE
    except ValueError:
        seconds = Fraction(0)
    if seconds.denominator != 1 or not 0 < seconds <= settings.MAX_MINUTES * MINUTE:
        findings.fault(Place("--round"), "round-unusable", str(said), limit=settings.MAX_MINUTES)
        return 1
    return int(seconds)


def _sheet(source: Readable | pd.DataFrame, wanted: Wanted, findings: Findings, name: str | None) -> Sheet:
    """Open the orders file and gather the rows of every column we know."""
    before = findings.count
    table = open_table(source, wanted, findings, name=name)
    unread = findings.count - before  # rows whose quotes are wrong
    positions = match_columns(table, wanted, findings)
    before = findings.count
    cells = gather(table, positions, findings)
    unread += findings.count - before
    if not len(cells) and not unread:
        findings.fault(table.place, "no-rows")
    return Sheet(table, cells, positions, findings)


def _read_columns(sheet: Sheet, clock: Clock | None) -> None:
    """Read every column there is; those on the clock only when the clock is known."""
    columns = [COLUMNS[name] for name in sheet.positions]
    numbers = (text for c in columns if c.kind == "number" for text in sheet.cells.columns[c.name].texts)
    how = How(find_marks(sheet.table.separator, numbers), clock or Clock())
    for column in columns:
        if clock is not None or column.kind != "moment":
            sheet.read(column.name, how)


def _assemble(sheet: Sheet, draft: Draft, round_s: int) -> dict[str, Any]:
    """Return the parts of the shop; they mean nothing if a fault was found on the way."""
    order_ids, job = _names(sheet, "order")
    machine_ids, machine = _names(sheet, "machine")
    floor = draft.floor
    machines = floor.machines
    if machines:
        index = {listed.id: position for position, listed in enumerate(machines)}
        if draft.machines_known:
            _report_unknown(sheet, machine_ids, machine, floor)
        known = np.array([*(index.get(name, NOBODY) for name in machine_ids), NOBODY], np.int64)
        machine = known[machine]
    else:
        machines = tuple(Machine(name) for name in machine_ids)
        _notice_alike(sheet, machine_ids, machine)
    families, family = _names(sheet, "family")
    seconds, unit_rounds = run_times(sheet, round_s)
    _notice_repeated(sheet, order_ids, job, machines, machine)
    _notice_idle(sheet)

    size = len(order_ids)
    release = _per_order(sheet, "release", job, size, 0, np.int64)
    due = _per_order(sheet, "due", job, size, NO_DUE, np.int64)
    _report_due_before_release(sheet, order_ids, job, release, due)
    return {
        "machines": machines,
        "orders": Orders(
            order_ids,
            release_s=np.maximum(release, 0),  # released before the shift is released when it starts
            due_s=due,
            priority=_per_order(sheet, "priority", job, size, 1.0, np.float64),
        ),
        "operations": Operations(
            job,
            machine,
            seconds,
            step=_per_row(sheet, "step", NO_STEP),
            splittable=_per_row(sheet, "splittable", 0),
            heads=_per_row(sheet, "heads", 1),
            family=np.where(family == NOBODY, NO_FAMILY, family),
            row=sheet.cells.row,
            notes=_notes(sheet),
        ),
        "families": families,
        "unit_rounds": unit_rounds,
    }


# ---- names ----------------------------------------------------------------------------------------


def _names(sheet: Sheet, name: str) -> tuple[tuple[str, ...], Ints]:
    """Return the distinct names in order of first appearance, and which of them each row has."""
    if name not in sheet:
        return (), np.full(len(sheet), NOBODY, np.int64)
    column = sheet[name]
    index: dict[str, int] = {}
    numbers = [NOBODY if value is None else index.setdefault(value, len(index)) for value in column.values]
    if COLUMNS[name].needed:
        sheet.fault_rows(np.flatnonzero(column.blank), f"{name}-missing", name, lambda _: {})
    return tuple(index), np.array(numbers, np.int64)[column.cells.codes]


def _report_unknown(sheet: Sheet, names: tuple[str, ...], machine: Ints, floor: Floor) -> None:
    listed = [entry.id for entry in floor.machines]
    known = set(listed)
    unknown = np.array([*(name not in known for name in names), False], np.bool_)
    left = NEAREST_BUDGET
    hints: dict[int, str] = {}

    def words(row: int) -> dict[str, Any]:
        nonlocal left
        which = int(machine[row])
        if which not in hints:
            left -= len(listed)
            close = nearest(names[which], listed) if left >= 0 else None
            hints[which] = f"write {close!r} if that is meant, " if close else ""
        return {"floor": floor.file, "nearest": hints[which]}

    sheet.fault_rows(np.flatnonzero(unknown[machine]), "machine-unknown", "machine", words)


def _notice_alike(sheet: Sheet, names: tuple[str, ...], machine: Ints) -> None:
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


def _notice_repeated(
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


def _notice_idle(sheet: Sheet) -> None:
    """Notice columns that are filled in although nothing in shop.toml makes them count."""
    for name in sheet.positions:
        table = COLUMNS[name].idle_without
        if table and name in sheet and bool(sheet[name].given.any()):
            place = sheet.table.at(sheet.table.place.row, sheet.positions[name])
            sheet.findings.notice(place, "column-idle", place.column, table=table)


# ---- values ---------------------------------------------------------------------------------------


def _per_row(sheet: Sheet, name: str, blank: int) -> Any:
    return sheet[name].numbers(blank, np.int64) if name in sheet else None


def _notes(sheet: Sheet) -> dict[int, str]:
    if "note" not in sheet:
        return {}
    column = sheet["note"]
    return {row: column.values[column.cells.codes[row]] for row in np.flatnonzero(column.given).tolist()}


def _per_order(sheet: Sheet, name: str, job: Ints, size: int, blank: float, dtype: type) -> Any:
    """Return one value an order; blank rows follow the rows that give it, and two values are a fault."""
    values: Any = np.full(size, blank, dtype)
    if name not in sheet:
        return values
    rows = np.flatnonzero(sheet[name].given & (job != NOBODY))
    given = sheet[name].numbers(blank, dtype)
    orders, at = np.unique(job[rows], return_index=True)
    first = np.zeros(size, np.int64)
    first[orders] = rows[at]
    values[orders] = given[first[orders]]
    differ = rows[given[rows] != values[job[rows]]]

    def words(row: int) -> dict[str, Any]:
        other = int(first[job[row]])
        return {"first": sheet.text(other, name), "row": sheet.row(other)}

    sheet.fault_rows(differ, f"{name}-differs", name, words)
    return values


def _report_due_before_release(
    sheet: Sheet, names: tuple[str, ...], job: Ints, release: Ints, due: Ints
) -> None:
    """Report each order due before its release, once, where its due time first stands.

    Without a release an order may be due before the shift starts: it is late already, which is no fault.
    """
    if "release" not in sheet or "due" not in sheet:
        return
    rows = np.flatnonzero(sheet["release"].given & (job != NOBODY))
    said = np.full(len(names), NOBODY, np.int64)
    said[job[rows[::-1]]] = rows[::-1]  # the first row that gives each order's release
    dues = np.flatnonzero(sheet["due"].given & (job != NOBODY))
    orders, at = np.unique(job[dues], return_index=True)
    early = (said[orders] != NOBODY) & (due[orders] < release[orders])

    def words(row: int) -> dict[str, Any]:
        order = int(job[row])
        return {"order": names[order], "release": sheet.text(int(said[order]), "release")}

    sheet.fault_rows(np.sort(dues[at[early]]), "due-before-release", "due", words)
