"""A plan file becomes a stated plan, for the audit to judge: plan.json, or a table edited by hand.

Nothing is believed and little is refused here: a cell must say something definite, but whether what it says
is possible is for the audit to find.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping
from typing import Any

import numpy as np

from shopfloor import settings
from shopfloor.model.schedule import NO_ROUND
from shopfloor.model.shop import Ints, Shop
from shopfloor.model.stated import StatedPlan
from shopfloor.read import cells as cell
from shopfloor.read.cells import CellFault
from shopfloor.read.headers import Wanted
from shopfloor.read.plan_json import is_json, read_plan_json
from shopfloor.read.plan_rules import plan_fault
from shopfloor.read.plan_times import choose_passes, moment_reader
from shopfloor.read.rules import Findings
from shopfloor.read.source import Readable, take
from shopfloor.read.table import Cells, Coded, Table, gather, open_table

NEEDED = ("order", "machine", "start", "end")
OPTIONAL: Mapping[str, int] = {"unit": 1, "round": NO_ROUND, "part": 1, "parts": 1}  # and what a blank means

# plan.json takes about twice the bytes of the orders it was made from, and is as large as a plan gets.
MAX_PLAN_BYTES = 3 * settings.MAX_FILE_BYTES

_COUNT = re.compile(r"\+?([0-9]{1,9})(?:[.,]0{0,2})?")


def load_plan(source: Readable, shop: Shop, *, name: str | None = None) -> StatedPlan:
    """Read a plan file for `shop`; what is in it decides whether as JSON, CSV or XLSX.

    Parameters
    ----------
    source
        Path, bytes or an open binary file. A table needs the columns order, machine, start and end, in any
        order and spelling of case, space, `_` and `-`; unit, round, part and parts may be left out or blank;
        other columns, such as note, are not looked at. In a workbook the sheet with most of them is read.
    shop
        Its clock reads the times. Around the hour that a clock set back repeats, its operations' times tell
        which pass is meant, then the order of the rows; where neither does, the first is taken.
    name
        What messages call the source.

    Returns
    -------
    StatedPlan
        Rows in the order of the file, numbered as a spreadsheet does, or from 1 in plan.json.

    Raises
    ------
    InputError
        With every fault of every row. O(n) for n rows: each distinct text is read once.
    """
    findings = Findings()
    taken = take(source, name=name, limit=MAX_PLAN_BYTES)
    if is_json(taken):
        return read_plan_json(taken, shop.clock, findings)
    table = open_table(taken.data, Wanted((*NEEDED, *OPTIONAL), NEEDED), findings, name=taken.name)
    positions = _positions(table, findings)
    cells = gather(table, positions, findings)
    if not len(cells):
        findings.fault(table.place, "no-rows")
    return _Rows(table, cells, positions, findings).state(shop)


def _positions(table: Table, findings: Findings) -> dict[str, int]:
    """Return where each column is; those missing or there twice become faults."""
    found = Wanted((*NEEDED, *OPTIONAL), NEEDED).find(table.header)
    for name, where in found.items():
        for position in where[1:]:
            plan_fault(findings, table.at(table.place.row, position), "plan-column-twice", name, name=name)
    missing = [name for name in NEEDED if name not in found]
    for name in missing:
        plan_fault(findings, table.place, "plan-column-missing", name=name, needed=", ".join(NEEDED))
    return {name: where[0] for name, where in found.items()}


class _Rows:
    """The rows of a plan file, read column by column, each distinct text once."""

    def __init__(self, table: Table, cells: Cells, positions: Mapping[str, int], findings: Findings) -> None:
        self.table = table
        self.cells = cells
        self.positions = positions
        self.findings = findings

    def state(self, shop: Shop) -> StatedPlan:
        """Return the plan, or raise every fault."""
        moment = moment_reader(shop.clock)
        readers: dict[str, tuple[Callable[[str], Any], Any]] = {
            "order": (cell.name_in_sheet, ""),
            "machine": (cell.name_in_sheet, ""),
            "start": (moment, (0, 0)),
            "end": (moment, (0, 0)),
            **{name: (_count, blank) for name, blank in OPTIONAL.items()},
        }
        in_file_order = sorted(self.positions, key=lambda name: self.positions[name])
        values = {name: self._values(name, *readers[name]) for name in in_file_order}
        self.findings.stop_if_any()
        columns: dict[str, Any] = {
            name: self._column(name, values.get(name, []), blank) for name, blank in OPTIONAL.items()
        }
        order, machine = (
            list(map(values[name].__getitem__, self.cells.columns[name].codes.tolist()))
            for name in ("order", "machine")
        )
        first, second = (
            {name: self._column(name, [pair[k] for pair in values[name]], 0) for name in ("start", "end")}
            for k in (0, 1)
        )
        start, end = choose_passes(shop, order, machine, first, second)
        return StatedPlan(self.cells.row, order, machine, start_s=start, end_s=end, **columns)

    def _column(self, name: str, by_text: list[int], blank: int) -> Ints:
        """Return an entry a row from an entry a distinct text; `blank` where there is no such column."""
        if name not in self.positions:
            return np.full(len(self.cells), blank, np.int64)
        column: Ints = np.array(by_text, np.int64)[self.cells.columns[name].codes]
        return column

    def _values(self, name: str, read: Callable[[str], Any], blank: Any) -> list[Any]:
        """Return a value for each distinct text of a column; a faulty one becomes a fault in every row."""
        values: list[Any] = []
        faults: dict[int, CellFault] = {}
        column = self.cells.columns[name]
        for code, text in enumerate(column.texts):
            value = blank
            try:
                cell.refuse_error_value(text)
                if not text and name in NEEDED:
                    raise CellFault("plan-cell-missing", name=name)
                if text and len(text) <= settings.MAX_CELL_CHARACTERS:  # a longer one is a fault already
                    value = read(text)
            except CellFault as fault:
                faults[code] = fault
            values.append(value)
        if faults:
            self._report(name, column, faults)
        return values

    def _report(self, name: str, column: Coded, faults: Mapping[int, CellFault]) -> None:
        faulty = np.zeros(len(column.texts), bool)
        faulty[list(faults)] = True
        rows = np.flatnonzero(faulty[column.codes]).tolist()

        def add(index: int) -> None:
            fault = faults[int(column.codes[index])]
            place = self.table.at(int(self.cells.row[index]), self.positions[name])
            plan_fault(self.findings, place, fault.rule, column.text(index), **fault.words)

        self.findings.each(rows, len(rows), add)


def _count(text: str) -> int:
    found = _COUNT.fullmatch(text)
    if found is None:
        raise CellFault("plan-count-unreadable")
    return int(found[1])
