"""The list of what is wrong with an input and what is worth saying: faults and notices, with their places."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, replace
from itertools import islice
from typing import Any, TypeVar

from shopfloor.errors import InputError
from shopfloor.model.results import Fault
from shopfloor.read.wording import NOTICES as NOTICES
from shopfloor.read.wording import RULES as RULES
from shopfloor.read.wording import Rule as Rule

MAX_FAULTS = 2_000  # kept; a file with more is wrong in a way that the first two thousand show
MAX_NOTICES = 100
MAX_VALUE_CHARACTERS = 40

_T = TypeVar("_T")


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
_QUOTED = frozenset({"other", "order", "machine", "first", "release", "start", "end"})


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
