"""Every rule that an input can break or bring to notice: one table of codes, and the list being filled.

A code never changes once released: programs may rely on it. `problem` ends a sentence that begins with the
value, `advice` says what to do; words in braces are filled in where the rule is applied.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, replace
from itertools import islice
from typing import Any, NamedTuple, TypeVar

from shopfloor.errors import InputError
from shopfloor.model.results import Fault

MAX_FAULTS = 2_000  # kept; a file with more is wrong in a way that the first two thousand show
MAX_NOTICES = 100
MAX_VALUE_CHARACTERS = 40

_T = TypeVar("_T")


class Rule(NamedTuple):
    """The words of one rule."""

    problem: str
    advice: str


_PLAIN = "write minutes such as 30 or 12.5, or h:mm such as 0:30"
_CSV = "save it as CSV or XLSX"

RULES: dict[str, Rule] = {
    # ---- the file as a whole ----------------------------------------------------------------------
    "file-missing": Rule("there is no such file", "check the name and the folder"),
    "file-unreadable": Rule("cannot be read ({reason})", "check that it is a file and that you may open it"),
    "file-empty": Rule("is empty", "export it again"),
    "file-too-large": Rule("has more than {limit:,} bytes", "delete what is not needed, or split the file"),
    "not-a-table": Rule("is {kind}, which this tool does not read", _CSV + "{extra}"),
    "binary": Rule("is no text file: it holds NUL bytes", _CSV),
    "encoding-broken": Rule("is not valid {encoding} from byte {byte:,} on", "save it again as CSV in UTF-8"),
    "encoding-unknown": Rule(
        "is neither UTF-8, UTF-16 nor Windows-1252 (byte {byte:,} is 0x{code:02X})", "save it as CSV in UTF-8"
    ),
    "workbook-damaged": Rule(
        "is a damaged workbook ({reason})", "open it in a spreadsheet and save it again"
    ),
    "workbook-too-large": Rule(
        "unpacks to more than {limit:,} bytes", "delete the sheets that are not needed, or save it as CSV"
    ),
    # ---- the table --------------------------------------------------------------------------------
    "no-rows": Rule("has a header but no rows", "export it again with its rows"),
    "too-many-rows": Rule("is beyond the {limit:,} rows this tool reads", "split the file"),
    "too-many-columns": Rule("has {count:,} columns, more than {limit:,}", "delete the columns not needed"),
    "cell-too-long": Rule("has {length:,} characters, more than {limit:,}", "shorten it"),
    "line-too-long": Rule("is a line of more than {limit:,} bytes", "check that this is the right file"),
    "row-too-wide": Rule(
        "stands to the right of the last header", "quote cells that hold the separator, or name the column"
    ),
    "open-quote": Rule(
        "a quotation mark opens here and is never closed; the file may be cut short",
        "close it, or export the file again",
    ),
    "stray-quote": Rule(
        "text follows a closing quotation mark",
        'write a quotation mark inside a quoted cell twice, as in "3"" pipe"',
    ),
    # ---- the header -------------------------------------------------------------------------------
    "column-missing": Rule(
        "has no column {name}{nearest}", "name it {name} in the header, or map it in shop.toml: {map}"
    ),
    "separator-unknown": Rule(
        "is one cell where a header should be", "separate columns by comma, semicolon or tab"
    ),
    "header-duplicate": Rule("stands in the header twice (columns {one} and {two})", "delete or rename one"),
    "header-clash": Rule("means {name}, and so does {other!r}", "delete or rename one of the two columns"),
    "mapped-header-missing": Rule(
        "is not in the header, but [columns] in shop.toml maps {name} to it{nearest}",
        "correct the one or the other",
    ),
    # ---- any cell ---------------------------------------------------------------------------------
    "formula-error": Rule("is a spreadsheet's error value", "correct the formula there, and save again"),
    "formula-not-calculated": Rule(
        "is a formula whose result was never saved",
        "open the file in a spreadsheet, save it, and read it again",
    ),
    "control-character": Rule("holds a line break or an invisible character ({code})", "delete it"),
    "name-too-long": Rule("has {length:,} characters, more than {limit}", "shorten it"),
    # ---- numbers ----------------------------------------------------------------------------------
    "decimal-comma": Rule(
        "has a decimal comma in a file whose columns are separated by commas",
        "write {point}, or separate the columns by semicolons",
    ),
    "thousands-separator": Rule("has a separator between thousands", "write digits only{plain}"),
    "number-ambiguous": Rule("may mean {large} or {small}", "write {large}, or {sure}"),
    "number-unreadable": Rule("is no number", "write digits such as 12 or 12.5"),
    "number-not-positive": Rule("is not above zero", "write a positive number"),
    "quantity-too-large": Rule("is more than {limit:,} pieces", "correct it"),
    # ---- order, machine, times --------------------------------------------------------------------
    "order-missing": Rule("is empty", "write the order's number"),
    "machine-missing": Rule("is empty", "write the machine"),
    "machine-unknown": Rule(
        "is not among the machines of {floor}",
        "{nearest}add a [[machine]] with this id there, or correct the name",
    ),
    "minutes-unreadable": Rule("is no time", _PLAIN),
    "minutes-not-positive": Rule("is not above zero", _PLAIN),
    "minutes-too-large": Rule("is longer than {limit:,} minutes", "correct it, or divide the order"),
    "minutes-rounds-to-zero": Rule("is less than half a second", "write at least 0:00:01"),
    "minutes-missing": Rule(
        "is empty, but other rows have times", "write the minutes, or quantity and minutes_each"
    ),
    "minutes-disagree": Rule(
        "is not quantity × minutes_each, which is {product} min",
        "correct one of the three, or leave minutes empty",
    ),
    "quantity-alone": Rule("has no {missing} beside it", "fill in {missing}, or write minutes"),
    # ---- release, due, priority, step and the rest ------------------------------------------------
    "release-unreadable": Rule("{problem}", "{advice}"),
    "due-unreadable": Rule("{problem}", "{advice}"),
    "time-far-away": Rule("is more than {years} years from the shift", "check the year"),
    "due-before-release": Rule(
        "is before the release of order {order!r}, {release!r}", "correct the one or the other"
    ),
    "release-differs": Rule(
        "differs from {first!r} in row {row} of the same order", "write one release an order"
    ),
    "due-differs": Rule(
        "differs from {first!r} in row {row} of the same order", "write one due time an order"
    ),
    "priority-differs": Rule(
        "differs from {first!r} in row {row} of the same order", "write one priority an order"
    ),
    "priority-too-fine": Rule("has more than three decimals", "write at most three"),
    "priority-too-large": Rule("is above {limit:,}", "write a smaller priority; only their ratio counts"),
    "step-unreadable": Rule(
        "is no whole number from 0 on", "write a rank such as 1, 2, 3, or leave it empty"
    ),
    "step-too-large": Rule("is above {limit:,}", "write a smaller rank; only their sequence counts"),
    "heads-unreadable": Rule("is no whole number from 0 on", "write the number of people needed"),
    "heads-too-large": Rule("is above {limit:,}", "write the number of people needed"),
    "splittable-unreadable": Rule("is neither yes nor no", "write yes or no, or leave it empty"),
    # ---- options and shop.toml --------------------------------------------------------------------
    "start-unreadable": Rule("{problem}", "write the start as YYYY-MM-DDTHH:MM, such as 2026-03-02T06:00"),
    "start-implausible": Rule("is not between 1970 and 2200", "check the year"),
    "end-unreadable": Rule("{problem}", "{advice}"),
    "end-not-after-start": Rule("is not after the start of the shift", "write a later end"),
    "end-too-late": Rule("is more than {days} days after the start of the shift", "check the date"),
    "offset-not-allowed": Rule(
        "has an offset from UTC", 'leave it out, and name the zone: zone = "Europe/London"'
    ),
    "round-unusable": Rule(
        "is no length of a round", "give whole seconds as minutes, such as 30 or 7.5, at most {limit:,}"
    ),
    "toml-syntax": Rule("is not valid TOML: {reason}", "correct the line"),
    "unknown-key": Rule("is no key this tool knows{nearest}", "correct or delete it; known here: {known}"),
    "not-supported-yet": Rule("is not supported by this version", "delete it; a plan would not keep to it"),
    "header-mapped-twice": Rule("is already the header of {name}", "give every column a header of its own"),
    "header-empty": Rule("names no header", "write the header as it stands in the export"),
    "wrong-kind": Rule("is {got}, not {wanted}", "write {wanted}"),
    "key-missing": Rule("is missing", "add it; every {table} needs one"),
    "zone-unknown": Rule("is no time zone{nearest}", "write an IANA name such as Europe/London"),
    "machine-duplicate": Rule(
        "is listed twice (first in line {row})", "delete one, or use count for identical units"
    ),
    "count-unusable": Rule("is no number of units", "write a whole number from 1 to {limit:,}"),
    # ---- the list itself --------------------------------------------------------------------------
    "more-faults": Rule(
        "{count:,} more faults are not listed", "correct these first, then read the file again"
    ),
}

NOTICES: dict[str, Rule] = {
    "columns-not-used": Rule(
        "these columns are not used: {names}", "map them in shop.toml under [columns] if they matter"
    ),
    "column-idle": Rule(
        "counts for nothing while shop.toml has no {table}", "the plan does not depend on it"
    ),
    "rows-above-header": Rule(
        "the rows above the header (row {row}) are not read", "nothing to do if they are a title"
    ),
    "sheets-not-read": Rule(
        "only this sheet is read, not {names}", "move the right one to the front if another is meant"
    ),
    "mapped-header-absent": Rule(
        "is not in the header, though [columns] in shop.toml maps {name} to it",
        "nothing to do if this is another export",
    ),
    "one-round-each": Rule(
        "has no times: every row is one round of {length}", "fill in the column if times are known"
    ),
    "seconds-rounded": Rule(
        "{count} to the nearest whole second; the first, in row {row}, is {seconds} s, taken as {rounded} s",
        "nothing to do unless a second matters",
    ),
    "quantity-beside-minutes": Rule(
        "{count} minutes and only one of quantity and minutes_each (first: row {row}); minutes is taken as "
        "the time of the whole lot",
        "fill in both if minutes is the time of one piece",
    ),
    "visit-repeated": Rule(
        "{count} an order to a machine it already visits (first: rows {earlier} and {row}, {order!r} on "
        "{machine!r})",
        "each is planned as a visit of its own; delete what stands there twice by mistake",
    ),
    "machines-alike": Rule(
        "reads like {other!r} in row {row} but is taken as another machine",
        "write one spelling if they are the same",
    ),
}


@dataclass(frozen=True, slots=True)
class Place:
    """Where something stands; `position` puts the columns of one row in order."""

    file: str
    sheet: str = ""
    row: int = 0
    column: str = ""
    position: int = 0

    @property
    def whole(self) -> Place:
        """The sheet as a whole."""
        return Place(self.file, self.sheet)

    def at(self, row: int, column: str = "", position: int = 0) -> Place:
        """Return another place in the same sheet."""
        return replace(self, row=row, column=column, position=position)


def shorten(text: str) -> str:
    """Cut `text` to what a message can carry."""
    return text if len(text) <= MAX_VALUE_CHARACTERS else text[: MAX_VALUE_CHARACTERS - 1] + "…"


class Findings:
    """Faults and notices, found in any order, handed out in the order of the files."""

    def __init__(self) -> None:
        self._files: dict[str, int] = {}
        self._faults: list[tuple[tuple[int, int, int, int], Fault]] = []
        self._notices: list[tuple[tuple[int, int, int, int], Fault]] = []
        self._alike: dict[tuple[str, str], int] = {}
        self.count = 0

    def fault(self, place: Place, rule: str, value: str = "", **words: Any) -> None:
        """Add one fault; those of one rule and column must come in the order of their rows."""
        self.count += 1
        alike = self._alike[rule, place.column] = self._alike.get((rule, place.column), 0) + 1
        if alike <= MAX_FAULTS:  # the first of every kind are enough to know the first of all
            self._add(self._faults, RULES[rule], place, rule, value, words)

    def notice(self, place: Place, rule: str, value: str = "", **words: Any) -> None:
        """Add what is no fault but worth saying."""
        if len(self._notices) < MAX_NOTICES:
            self._add(self._notices, NOTICES[rule], place, rule, value, words)

    def each(self, things: Iterable[_T], count: int, add: Callable[[_T], None]) -> None:
        """Add `count` faults of one rule and column; `add` is called only for those that can be kept."""
        before = self.count
        for thing in islice(things, MAX_FAULTS):
            add(thing)
        self.count = before + count

    def merge(self, error: InputError) -> None:
        """Add what another reader raised."""
        for fault in error.faults:
            self.count += 1
            self._keep(self._faults, Place(fault.file, fault.sheet, fault.row, fault.column), fault)

    def _add(
        self, kept: list[Any], rule: Rule, place: Place, code: str, value: str, words: dict[str, Any]
    ) -> None:
        said = {name: shorten(word) if name in _QUOTED else word for name, word in words.items()}
        fault = Fault(
            file=place.file,
            sheet=place.sheet,
            row=place.row,
            column=place.column,
            value=shorten(value),
            rule=code,
            problem=rule.problem.format(**said),
            advice=rule.advice.format(**said),
        )
        self._keep(kept, place, fault)

    def _keep(self, kept: list[Any], place: Place, fault: Fault) -> None:
        rank = self._files.setdefault(place.file, len(self._files))
        kept.append(((rank, place.row, place.position, len(kept)), fault))

    @property
    def faults(self) -> tuple[Fault, ...]:
        """Every fault in file order; beyond the first two thousand only their number."""
        listed = [fault for _, fault in sorted(self._faults, key=lambda entry: entry[0])][:MAX_FAULTS]
        rest = self.count - len(listed)
        if rest:
            more = RULES["more-faults"]
            last = listed[-1]
            listed.append(
                Fault(
                    last.file,
                    0,
                    "",
                    "",
                    "more-faults",
                    more.problem.format(count=rest),
                    more.advice,
                    last.sheet,
                )
            )
        return tuple(listed)

    @property
    def notices(self) -> tuple[Fault, ...]:
        """Every notice in file order."""
        return tuple(fault for _, fault in sorted(self._notices, key=lambda entry: entry[0]))

    def stop_if_any(self) -> None:
        """Raise the complete list, if there is anything on it.

        Raises
        ------
        InputError
            With every fault, and the notices beside them.
        """
        if self.count:
            raise InputError(self.faults, self.notices)


# Words that come from a file and are therefore cut before they enter a sentence.
_QUOTED = frozenset({"other", "order", "machine", "first", "release"})


def printable(name: str) -> str:
    """Return a name that a terminal shows as it is, whatever a hostile file was called."""
    return "".join(c if c.isprintable() else "?" for c in name)


def refuse(place: Place, rule: str, value: str = "", **words: Any) -> InputError:
    """Return the error for a file that cannot be read any further."""
    findings = Findings()
    findings.fault(place, rule, value, **words)
    return InputError(findings.faults)


def count_of(number: int, one: str, many: str) -> str:
    """Write a count with its noun and verb: `1 row repeats`, `12 rows repeat`."""
    return f"1 {one}" if number == 1 else f"{number:,} {many}"
