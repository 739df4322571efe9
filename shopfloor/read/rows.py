"""What the rows of an orders file share: names, values an order inherits, defaults of machines."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from shopfloor.model.shop import Ints, Machine
from shopfloor.read.columns import COLUMNS, Sheet

NOBODY = -1  # a row whose order, machine or family is not known


def names_of(sheet: Sheet, name: str) -> tuple[tuple[str, ...], Ints]:
    """Return the distinct names in order of first appearance, and which of them each row has."""
    if name not in sheet:
        return (), np.full(len(sheet), NOBODY, np.int64)
    column = sheet[name]
    index: dict[str, int] = {}
    numbers = [NOBODY if value is None else index.setdefault(value, len(index)) for value in column.values]
    if COLUMNS[name].needed:
        sheet.fault_rows(np.flatnonzero(column.blank), f"{name}-missing", name, lambda _: {})
    return tuple(index), np.array(numbers, np.int64)[column.cells.codes]


def per_row(sheet: Sheet, name: str, blank: int) -> Any:
    """Return one value a row, or None without such a column."""
    return sheet[name].numbers(blank, np.int64) if name in sheet else None


def or_default(sheet: Sheet, name: str, default: Ints) -> Ints:
    """Return one value a row, and where the cell is blank the default of the row's machine."""
    if name not in sheet:
        return default
    return np.where(sheet[name].given, sheet[name].numbers(0, np.int64), default)


def of_machine(machines: Sequence[Machine], values: Mapping[str, int], blank: int) -> Ints:
    """Return a value for each machine, and a last one for rows whose machine is not known."""
    return np.array([*(values.get(machine.id, blank) for machine in machines), blank], np.int64)


def notes_of(sheet: Sheet) -> dict[int, str]:
    """Return the notes there are, by row."""
    if "note" not in sheet:
        return {}
    column = sheet["note"]
    return {row: column.values[column.cells.codes[row]] for row in np.flatnonzero(column.given).tolist()}


def per_order(sheet: Sheet, name: str, job: Ints, size: int, blank: float, dtype: type) -> Any:
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


def report_due_before_release(
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
