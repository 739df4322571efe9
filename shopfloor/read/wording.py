"""The words of every rule that an input can break or bring to notice: one table of codes.

A code never changes once released: programs may rely on it. `problem` ends a sentence that begins with the
value, `advice` says what to do; words in braces are filled in where the rule is applied.
"""

from __future__ import annotations

from typing import NamedTuple


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
    "setup-negative": Rule("is below zero", "write 0, or minutes such as 10, or h:mm such as 0:10"),
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
    "header-mapped-twice": Rule("is already the header of {name}", "give every column a header of its own"),
    "header-empty": Rule("names no header", "write the header as it stands in the export"),
    "wrong-kind": Rule("is {got}, not {wanted}", "write {wanted}"),
    "key-missing": Rule("is missing", "add it; every {table} needs one"),
    "zone-unknown": Rule("is no time zone{nearest}", "write an IANA name such as Europe/London"),
    "machine-duplicate": Rule(
        "is listed twice (first in line {row})", "delete one, or use count for identical units"
    ),
    "count-unusable": Rule("is no number of units", "write a whole number from 1 to {limit:,}"),
    "crew-duplicate": Rule("is listed twice (first in line {row})", "delete one"),
    "crew-unknown": Rule("is no crew of this file{nearest}", "correct it, or add a [[crew]] with this id"),
    "heads-unusable": Rule("is no number of people", "write a whole number from 0 to {limit:,}"),
    "attended-unknown": Rule("is neither always nor set-up", 'write "always" or "set-up"'),
    "minutes-unusable": Rule(
        "is no length of time in whole seconds", "write minutes from 0 to {limit:,}, such as 15 or 7.5"
    ),
    "from-unreadable": Rule("{problem}", "{advice}"),
    "to-unreadable": Rule("{problem}", "{advice}"),
    "to-not-after-from": Rule(
        "is not after {first!r}{why}", "write a later time, with its date if it is on another day"
    ),
    "breaks-overlap": Rule(
        "lies in the break from {start!r} to {end!r}", "make one break of the two, or correct the times"
    ),
    "levels-overlap": Rule(
        "lies in the level from {start!r} to {end!r}", "correct the times: a crew has one level at a time"
    ),
    "never-open": Rule(
        "is never open from the shift's start on", "correct its opening hours, or leave open out"
    ),
    "machine-not-listed": Rule(
        "is no machine of this file{nearest}", "correct it, or add a [[machine]] with this id"
    ),
    "pair-to-itself": Rule("is no change", "delete it: from a thing to itself takes no time"),
    "pair-twice": Rule("stands here twice", "delete one of the two"),
    "too-many-names": Rule(
        "has {count:,} names in its pairs, more than the {limit:,} that can still be checked",
        "give only the pairs that differ from between",
    ),
    "way-round-shorter": Rule("contradicts itself: {problem}", "{advice}"),
    "between-missing": Rule(
        "is missing, so pairs that are not listed take no time, and {problem}",
        "add between: the minutes of every pair that is not listed",
    ),
    "crew-option-unusable": Rule("is no number of people", "give a whole number from 0 to {limit:,}"),
    "crew-option-taken": Rule(
        "would make a crew of the name 'crew', which {floor} has already", "rename the crew there"
    ),
    # ---- what no plan can do ----------------------------------------------------------------------
    "too-few-heads": Rule("{problem}", "{advice}"),
    "never-open-again": Rule("{problem}", "{advice}"),
    "longer-than-any-opening": Rule("{problem}", "{advice}"),
    "longer-than-heads-stay": Rule("{problem}", "{advice}"),
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
    "setup-rounded": Rule(
        "{count} to the nearest whole second; the first, in row {row}, is {seconds} s, taken as {rounded} s",
        "nothing to do unless a second matters",
    ),
    "machine-without-crew": Rule(
        "has {key} but no crew", "add its crew; {key} counts only for a crew given with --crew"
    ),
    "crew-idle": Rule("is the crew of no machine", 'name it where it works: crew = "{crew}"'),
    "level-outside": Rule(
        "begins a level of crew {crew} that lies outside the shift", "check the times and the date"
    ),
    "set-up-only-idle": Rule(
        "is attended at set-up only, but no row on it has a set-up: it takes nobody",
        "write setup_minutes, here or in the orders, or delete attended",
    ),
    "machine-not-visited": Rule(
        "is visited by no row of the orders{nearest}", "nothing to do if it is meant for other orders"
    ),
    "changeover-idle": Rule(
        "has changeovers, but no row on it has a family", "write the column family, or map it in [columns]"
    ),
    "families-not-used": Rule(
        "has changeovers for {names}, which no row on it has", "correct them, or leave them for other orders"
    ),
    "family-idle": Rule(
        "is a family that no row on {machine} has and no pair there names{nearest}",
        "correct it, or leave it: the first change then takes what between says",
    ),
    "family-without-changeover": Rule(
        "counts for nothing while shop.toml has no [changeover] for {machine}", "add it, or delete the family"
    ),
    "released-after-shift": Rule(
        "{count} released at {end}, when the shift ends, or later; the first is {order!r} in row {row}",
        "carry them over to the next shift",
    ),
    "beyond-shift": Rule(
        "{count} end within the shift even if nothing else is planned; the first is {order!r} on {machine!r} "
        "in row {row}",
        "check its time and the opening hours, or carry it over to the next shift",
    ),
    "machines-alike": Rule(
        "reads like {other!r} in row {row} but is taken as another machine",
        "write one spelling if they are the same",
    ),
}
