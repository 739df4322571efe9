"""The columns of the orders file: one table, and the reading of one column through it.

To add a column: a line in ``COLUMNS``, its reader in `cells`, and a line in `orders` where the shop is built.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from shopfloor import settings
from shopfloor.model.calendar import Clock
from shopfloor.model.shop import Bools, Ints
from shopfloor.read import cells as cell
from shopfloor.read.cells import CellFault, Marks
from shopfloor.read.rules import MAX_FAULTS, Findings, Place
from shopfloor.read.table import Cells, Coded, Table


@dataclass(frozen=True, slots=True)
class How:
    """What a reader of cells must know besides the text."""

    marks: Marks
    clock: Clock


Reader = Callable[[str, How], Any]


def _text(read: Callable[[str], Any]) -> Reader:
    return lambda text, how: read(text)


def _number(read: Callable[[str, Marks], Any]) -> Reader:
    return lambda text, how: read(text, how.marks)


def _moment(name: str) -> Reader:
    return lambda text, how: cell.moment(text, how.clock, name)


@dataclass(frozen=True, slots=True)
class Column:
    """One column of the orders file.

    Attributes
    ----------
    name
        As users write it.
    kind
        ``text``; ``number``, whose cells tell how the table writes decimals; or ``moment`` on the clock.
    read
        Turns the text of a cell that is not blank into a value, or raises :class:`CellFault`.
    help
        For the documentation.
    needed
        Whether there is no orders file without it.
    idle_without
        The table of shop.toml without which nothing depends on the column.
    """

    name: str
    kind: str
    read: Reader
    help: str
    needed: bool = False
    idle_without: str = ""


COLUMNS: Mapping[str, Column] = {
    column.name: column
    for column in (
        Column("order", "text", _text(cell.name_in_sheet), "Work order; leading zeros kept.", needed=True),
        Column("machine", "text", _text(cell.name_in_sheet), "Machine or group.", needed=True),
        Column("minutes", "number", _number(cell.length), "Run time, decimal minutes or h:mm."),
        Column("quantity", "number", _number(cell.quantity), "Pieces; with minutes_each instead of minutes."),
        Column("minutes_each", "number", _number(cell.length), "Run time of one piece."),
        Column("setup_minutes", "number", _number(cell.set_up), "Set-up before the run time, on top of it."),
        Column("release", "moment", _moment("release"), "Earliest start of the order."),
        Column("due", "moment", _moment("due"), "Wanted finish of the order."),
        Column("priority", "number", _number(cell.priority), "Weight of the order; 1 unless given."),
        Column("family", "text", _text(cell.name_in_sheet), "Setup family.", idle_without="[changeover]"),
        Column("step", "text", _text(cell.step), "Rank inside the order; blank is any time."),
        Column("splittable", "text", _text(cell.splittable), "Whether the operation may be cut: yes or no."),
        Column(
            "heads",
            "text",
            _text(cell.heads),
            "People it takes from its machine's crew.",
            idle_without="[[crew]]",
        ),
        Column("note", "text", _text(cell.note), "Any remark; printed on the lists."),
    )
}


@dataclass(frozen=True)
class Read:
    """One column that has been read: a value for each distinct text, and which rows have one.

    Attributes
    ----------
    column
        The column.
    cells
        Its cells as texts.
    position
        In the table.
    values
        A value for each distinct text; None where the cell is blank or faulty.
    """

    column: Column
    cells: Coded
    position: int
    values: tuple[Any, ...]

    @cached_property
    def given(self) -> Bools:
        """Whether each row has a value."""
        known = np.fromiter((value is not None for value in self.values), np.bool_, len(self.values))
        return known[self.cells.codes]

    @cached_property
    def blank(self) -> Bools:
        """Whether each row is blank here."""
        empty = np.fromiter((not text for text in self.cells.texts), np.bool_, len(self.cells.texts))
        return empty[self.cells.codes]

    def numbers(self, blank: float, dtype: type) -> Any:
        """Return the values as an array, an entry a row."""
        filled: Any = np.array([blank if value is None else value for value in self.values], dtype=dtype)
        return filled[self.cells.codes]


class Sheet:
    """The rows of an orders file with their columns read; the home of places and of faults by row."""

    def __init__(self, table: Table, cells: Cells, positions: Mapping[str, int], findings: Findings) -> None:
        self.table = table
        self.cells = cells
        self.positions = positions
        self.findings = findings
        self._read: dict[str, Read] = {}

    def __len__(self) -> int:
        return len(self.cells)

    def __contains__(self, name: object) -> bool:
        return name in self._read

    def __getitem__(self, name: str) -> Read:
        return self._read[name]

    def place(self, index: int, name: str) -> Place:
        """Return the place of a cell; of the header's row if the file has no such column."""
        row = int(self.cells.row[index])
        if name in self.positions:
            return self.table.at(row, self.positions[name])
        return self.table.place.at(row, name, len(self.table.header) + 1)

    def row(self, index: int) -> int:
        """Return the row number that a spreadsheet shows."""
        return int(self.cells.row[index])

    def text(self, index: int, name: str) -> str:
        """Return the text of a cell, as a message shows it."""
        return self.cells.columns[name].text(index).removeprefix("\0") if name in self.cells.columns else ""

    def fault_rows(self, rows: Ints, rule: str, name: str, words: Callable[[int], dict[str, Any]]) -> None:
        """Add one fault a row, in column `name`."""

        def add(index: int) -> None:
            self.findings.fault(self.place(index, name), rule, self.text(index, name), **words(index))

        self.findings.each(rows.tolist(), len(rows), add)

    def read(self, name: str, how: How) -> None:
        """Read column `name`, each distinct text once; every faulty cell becomes a fault."""
        column, coded = COLUMNS[name], self.cells.columns[name]
        values: list[Any] = []
        broken: dict[str, list[int]] = {}  # rule -> the texts that break it
        words: dict[int, dict[str, Any]] = {}
        for code, text in enumerate(coded.texts):
            value = None
            if text and len(text) <= settings.MAX_CELL_CHARACTERS:  # a longer one is a fault already
                try:
                    cell.refuse_error_value(text)
                    value = column.read(text, how)
                except CellFault as fault:
                    alike = broken.setdefault(fault.rule, [])
                    alike.append(code)
                    if len(alike) <= MAX_FAULTS:  # texts are coded as they appear: no later one can be listed
                        words[code] = fault.words
            values.append(value)
        self._read[name] = Read(column, coded, self.positions[name], tuple(values))
        for rule, codes in broken.items():
            flagged = np.zeros(len(coded.texts), np.bool_)
            flagged[codes] = True
            rows = np.flatnonzero(flagged[coded.codes])
            self.fault_rows(rows, rule, name, lambda row: words[int(coded.codes[row])])
