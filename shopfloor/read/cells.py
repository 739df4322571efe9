"""One cell at a time: text in, a value out, or the rule it breaks. Pure; knows neither rows nor files."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterable
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

from shopfloor import settings
from shopfloor.model.clock import DAY, MINUTE, Clock
from shopfloor.read.forms import ERROR_VALUES, NOT_CALCULATED

FAR_YEARS = 10  # a release or due time further from the shift than this has a mistyped year
MAX_HEADS = 10_000

_NUMBER = re.compile(r"[+-]?(?:[0-9]{1,15}(?:([.,])([0-9]{0,25}))?|([.,])([0-9]{1,25}))")
_GROUPED = re.compile(r"[+-]?[0-9]{1,3}(?:(?:[.,' \u00a0\u202f\u2009_’][0-9]{3})+)(?:[.,][0-9]*)?")
_ONE_GROUP = re.compile(r"[+-]?([1-9][0-9]{0,2})([.,])([0-9]{3})")
_LENGTH = re.compile(r"([+-]?)([0-9]{1,6}):([0-5][0-9])(?::([0-5][0-9])(?:[.,]([0-9]{1,6}))?)?")
_YES = frozenset({"yes", "y", "true", "t", "1", "x"})
_NO = frozenset({"no", "n", "false", "f", "0", "-"})


class CellFault(Exception):  # noqa: N818 - it is caught by the reader of the column, never seen by a user
    """A cell breaks a rule; the place is added by whoever knows it."""

    def __init__(self, rule: str, **words: Any) -> None:
        super().__init__(rule)
        self.rule = rule
        self.words = words


@dataclass(frozen=True, slots=True)
class Marks:
    """How this table writes decimals.

    Attributes
    ----------
    comma
        Whether a comma may be a decimal mark: not where commas separate columns.
    sure
        Marks known to be decimal. A lone mark before exactly three digits, as in `1.500`, is taken for a
        decimal mark only if it is one of them, because elsewhere it may part thousands.
    """

    comma: bool = False
    sure: frozenset[str] = frozenset(".")


def find_marks(separator: str, texts: Iterable[str]) -> Marks:
    """Learn from the numbers of a table which decimal marks it uses.

    Commas between columns leave only the point. A workbook (no separator) hands numbers over with a point.
    Elsewhere a mark is sure once some number can be read in no other way, such as `12,5` or `0.250`.
    """
    if separator == ",":
        return Marks()
    seen: set[str] = set()
    for text in texts:
        found = _NUMBER.fullmatch(text)
        mark = found and (found[1] or found[3])
        if mark and not _ONE_GROUP.fullmatch(text):
            seen.add(mark)
            if len(seen) == 2:
                break
    if not separator:
        return Marks(comma=True, sure=frozenset({".", *seen}))
    return Marks(
        comma=True, sure=frozenset(seen) if len(seen) == 1 else frozenset()
    )  # both marks: neither is sure


def number(text: str, marks: Marks, unreadable: str = "number-unreadable") -> Fraction:
    """Read a decimal number exactly."""
    found = _NUMBER.fullmatch(text)
    if found is None:
        if _GROUPED.fullmatch(text):
            raise CellFault("thousands-separator", plain=_without_groups(text))
        raise CellFault(unreadable)
    mark = found[1] or found[3]
    if mark:
        group = _ONE_GROUP.fullmatch(text)
        if group and (mark not in marks.sure or (mark == "," and not marks.comma)):
            raise CellFault("number-ambiguous", **_two_readings(group[1], group[3]))
        if mark == "," and not marks.comma:
            raise CellFault("decimal-comma", point=text.replace(",", "."))
    return Fraction(text.replace(",", ".").rstrip("."))


def _two_readings(front: str, back: str) -> dict[str, str]:
    """Return both readings of `1.500`, and a way to write the small one that has no other."""
    small = f"{front}.{back}".rstrip("0").rstrip(".")
    return {"large": front + back, "small": small, "sure": small if back.endswith("0") else small + "0"}


def _without_groups(text: str) -> str:
    """Return the advice for `1,234,567`: the digits without what parts them, where that is beyond doubt."""
    marks = {c for c in text if not c.isdigit() and c not in "+-"}
    return f", such as {re.sub('[^0-9]', '', text)}" if len(marks) == 1 else ""


def length(text: str, marks: Marks) -> Fraction:
    """Read a time, decimal minutes or `h:mm[:ss]`, as an exact number of seconds above zero."""
    seconds = _time(text, marks)
    if seconds <= 0:
        raise CellFault("minutes-not-positive")
    return seconds


def set_up(text: str, marks: Marks) -> Fraction:
    """Read a set-up time like :func:`length`; it may be zero."""
    seconds = _time(text, marks)
    if seconds < 0:
        raise CellFault("setup-negative")
    return seconds


def _time(text: str, marks: Marks) -> Fraction:
    found = _LENGTH.fullmatch(text)
    if found:
        sign, hours, minutes, whole, part = found.groups()
        seconds = Fraction(int(hours) * 3600 + int(minutes) * MINUTE + int(whole or 0))
        seconds = (seconds + Fraction(f"0.{part or 0}")) * (-1 if sign == "-" else 1)
    else:
        seconds = number(text, marks, "minutes-unreadable") * MINUTE
    if seconds > settings.MAX_MINUTES * MINUTE:
        raise CellFault("minutes-too-large", limit=settings.MAX_MINUTES)
    return seconds


def nearest_second(seconds: Fraction) -> int:
    """Round to a whole second, halves up."""
    return (2 * seconds.numerator + seconds.denominator) // (2 * seconds.denominator)


def quantity(text: str, marks: Marks) -> Fraction:
    """Read how many pieces, above zero; parts of a piece are allowed, for goods by length or weight."""
    value = number(text, marks)
    if value <= 0:
        raise CellFault("number-not-positive")
    if value > settings.MAX_QUANTITY:
        raise CellFault("quantity-too-large", limit=settings.MAX_QUANTITY)
    return value


def priority(text: str, marks: Marks) -> float:
    """Read a weight above zero with at most three decimals."""
    value = number(text, marks)
    if value <= 0:
        raise CellFault("number-not-positive")
    if value > settings.MAX_PRIORITY:
        raise CellFault("priority-too-large", limit=settings.MAX_PRIORITY)
    if (value * 1000).denominator != 1:
        raise CellFault("priority-too-fine")
    return float(value)


def whole(text: str, limit: int, name: str) -> int:
    """Read a whole number from 0 to `limit`; `name` heads the codes of its rules."""
    found = re.fullmatch(r"\+?([0-9]{1,15})(?:[.,]0{0,2})?", text)
    if found is None:
        raise CellFault(f"{name}-unreadable")
    value = int(found[1])
    if value > limit:
        raise CellFault(f"{name}-too-large", limit=limit)
    return value


def step(text: str) -> int:
    """Read a rank inside an order."""
    return whole(text, settings.MAX_STEP, "step")


def heads(text: str) -> int:
    """Read how many people an operation takes."""
    return whole(text, MAX_HEADS, "heads")


def splittable(text: str) -> bool:
    """Read a yes or no in one of its usual spellings."""
    word = text.casefold()
    if word in _YES:
        return True
    if word in _NO:
        return False
    raise CellFault("splittable-unreadable")


def moment(text: str, clock: Clock, name: str) -> int:
    """Read a moment in seconds since the shift's start; `name` heads the code of its rule."""
    try:
        seconds = clock.read(text)
    except OverflowError:
        raise CellFault("time-far-away", years=FAR_YEARS) from None
    except ValueError as error:
        problem, _, advice = str(error).partition("; ")
        raise CellFault(f"{name}-unreadable", problem=problem, advice=advice) from None
    if abs(seconds) > FAR_YEARS * 366 * DAY:
        raise CellFault("time-far-away", years=FAR_YEARS)
    return seconds


# What our writers put an apostrophe before, with the apostrophes that were there already.
_NEUTRALISED = re.compile(r"'+[=+\-@\t\r\n＝＋－＠]")


def plain(text: str) -> str:
    """Return a text without the apostrophe that keeps a spreadsheet from running it as a formula."""
    return text[1:] if _NEUTRALISED.match(text) else text


def name_of(text: str) -> str:
    """Read the name of an order, a machine or a family: one visible line of bounded length.

    Refused are line breaks, control characters and the invisible ones that turn or hide text, since two
    names must differ where people look; joiners stay, some scripts are written with them.
    """
    for character in "" if text.isprintable() else text:
        category = unicodedata.category(character)
        if category in {"Cc", "Cs", "Zl", "Zp"} or (category == "Cf" and character not in "\u200c\u200d"):
            raise CellFault("control-character", code=f"U+{ord(character):04X}")
    if len(text) > settings.MAX_NAME_CHARACTERS:
        raise CellFault("name-too-long", length=len(text), limit=settings.MAX_NAME_CHARACTERS)
    return text


def name_in_sheet(text: str) -> str:
    """Read a name that stands in a spreadsheet, where one that begins like a formula has an apostrophe."""
    return name_of(plain(text))


def note(text: str) -> str:
    """Read a remark: any text, line breaks and tabs included, but no other control characters."""
    text = plain(text)
    for character in "" if text.isprintable() else text:
        if unicodedata.category(character) in {"Cc", "Cs"} and character not in "\n\r\t":
            raise CellFault("control-character", code=f"U+{ord(character):04X}")
    return text.replace("\r\n", "\n").replace("\r", "\n")


def refuse_error_value(text: str) -> None:
    """Refuse what a spreadsheet leaves in a cell whose formula failed or was never calculated."""
    if text in ERROR_VALUES:
        raise CellFault("formula-error")
    if text == NOT_CALCULATED:
        raise CellFault("formula-not-calculated")
