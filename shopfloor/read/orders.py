"""The orders file: rows of text become a shop, or the complete list of what is wrong with them."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from typing import TYPE_CHECKING

import numpy as np

from shopfloor import settings
from shopfloor.errors import InputError
from shopfloor.model.calendar import MINUTE, Clock
from shopfloor.model.results import Fault
from shopfloor.model.shop import Shop
from shopfloor.read.assemble import Parts, assemble
from shopfloor.read.cells import MAX_HEADS, find_marks
from shopfloor.read.columns import COLUMNS, How, Sheet
from shopfloor.read.floor import Draft, Floor, put_on_clock, read_floor
from shopfloor.read.headers import Wanted
from shopfloor.read.match import match_columns
from shopfloor.read.possible import notice_late, report_impossible
from shopfloor.read.remarks import notice_hall, notice_idle, notice_unlisted
from shopfloor.read.rules import Findings, Place
from shopfloor.read.shift import Moment
from shopfloor.read.source import Readable
from shopfloor.read.table import gather, open_table

if TYPE_CHECKING:
    import pandas as pd


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
    crew: int | None = None,
    split: bool = False,
) -> Shop:
    """Read work orders into a shop; see :func:`load`, which also hands over the notices.

    Examples
    --------
    >>> read_orders(b"order,machine,minutes\\nTQ-1,WASH,30\\n").operation(0).seconds
    1800
    """
    return load(
        source, shop=shop, start=start, end=end, round_minutes=round_minutes, crew=crew, split=split
    ).shop


def load(
    source: Readable | pd.DataFrame,
    *,
    shop: Readable | Floor | None = None,
    start: Moment | None = None,
    end: Moment | None = None,
    round_minutes: float | None = None,
    crew: int | None = None,
    split: bool = False,
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
    crew
        Heads of one crew for every machine that shop.toml gives none.
    split
        Whether every operation may be cut into parts, whatever its row says.
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
    floor, timed = _floor(shop, start, end, findings)
    crew = _check_crew(crew, floor, findings)
    round_s = _round_seconds(round_minutes, findings)
    wanted = Wanted(tuple(COLUMNS), tuple(n for n, c in COLUMNS.items() if c.needed), floor.columns)
    try:
        sheet = _sheet(source, wanted, findings, name)
    except InputError as error:
        findings.merge(error)
        raise InputError(findings.faults, findings.notices) from None
    _read_columns(sheet, floor.clock if timed else None)
    parts = assemble(sheet, floor, round_s)
    notice_idle(sheet, floor, crew)
    notice_unlisted(floor, parts.machines, findings)
    _check_sound_rows(sheet, floor, parts, crew, split)
    findings.stop_if_any()
    return Reading(
        shop=parts.shop(floor, crew, split),
        notices=findings.notices,
        inputs=((sheet.table.place.file, sheet.table.sha256), *floor.inputs),
    )


def _floor(
    shop: Readable | Floor | None, start: Moment | None, end: Moment | None, findings: Findings
) -> tuple[Floor, bool]:
    """Return the floor, and whether its clock can be told."""
    draft = Draft()
    if isinstance(shop, Floor):
        draft = shop.draft
    elif shop is not None:
        try:
            draft = read_floor(shop, findings)
        except InputError as error:
            findings.merge(error)
            draft = Draft(shift_known=False, machines_known=False)
    return put_on_clock(draft, findings, start, end)


def _check_crew(crew: int | None, floor: Floor, findings: Findings) -> int | None:
    """Return the crew that stands beside those of shop.toml, if there is one and it can be used."""
    if crew is None:
        return None
    if isinstance(crew, bool) or not isinstance(crew, int) or not 0 <= crew <= MAX_HEADS:
        findings.fault(Place("--crew"), "crew-option-unusable", str(crew), limit=MAX_HEADS)
        return None
    if any(listed.id == "crew" for listed in floor.crews):
        findings.fault(Place("--crew"), "crew-option-taken", str(crew), floor=floor.draft.file)
        return None
    return crew


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


def _check_sound_rows(sheet: Sheet, floor: Floor, parts: Parts, crew: int | None, split: bool) -> None:
    """Report what no plan can do and notice what has no effect, in the rows that are otherwise sound."""
    sound = parts.sound
    if sound.any():
        shop = parts.shop(floor, crew, split, sound)
        rows = np.flatnonzero(sound)
        notice_hall(floor, shop, sheet.findings)
        found = report_impossible(sheet, shop, rows)
        notice_late(sheet, shop, rows, found)
