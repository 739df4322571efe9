"""Text forms of what a workbook or a DataFrame holds, so that every source is read by the same rules."""

from __future__ import annotations

import math
from datetime import date, datetime, time, timedelta
from decimal import Decimal
from typing import Any

NOT_CALCULATED = "\0formula"  # stands for a formula without a saved result; no file can hold the character
ERROR_VALUES = frozenset(
    {"#N/A", "#REF!", "#NAME?", "#VALUE!", "#DIV/0!", "#NULL!", "#NUM!", "#SPILL!", "#CALC!", "#GETTING_DATA"}
)


def text_of(value: Any, number_format: str = "") -> str:
    """Write one cell as text.

    A moment becomes ``YYYY-MM-DDTHH:MM[:SS]``, a time of day or a length of time ``h:mm[:ss]``, a number its
    shortest decimal digits as a spreadsheet shows them (``42``, not ``42.0``), nothing (None, NaN) ``""``.

    Parameters
    ----------
    number_format
        How the spreadsheet shows the cell: a date shown without a time stays a date, and a number shown with
        leading zeros (format ``00000``) keeps them.
    """
    if isinstance(value, str):
        return value
    if value is None or _missing(value):
        return ""
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, int):
        return _padded(str(value), number_format)
    if isinstance(value, float):
        return _padded(_decimal(value), number_format)
    if isinstance(value, datetime):
        return _moment(value, number_format)
    if isinstance(value, date):
        return value.isoformat()
    if isinstance(value, time):
        whole = timedelta(
            hours=value.hour, minutes=value.minute, seconds=value.second, microseconds=value.microsecond
        )
        return _length(whole)
    if isinstance(value, timedelta):
        return _length(value)
    if hasattr(value, "item"):  # a NumPy scalar
        return text_of(value.item(), number_format)
    return str(value)


def _missing(value: Any) -> bool:
    """Whether a value is NaN, NaT (which differ from themselves) or NA (which says neither yes nor no)."""
    try:
        return bool(value != value)
    except TypeError:
        return True


def _padded(digits: str, number_format: str) -> str:
    return digits.zfill(len(number_format)) if number_format.strip("0") == "" else digits


def _decimal(value: float) -> str:
    if math.isinf(value):
        return "inf" if value > 0 else "-inf"
    text = f"{value:.15g}"  # a spreadsheet keeps and shows fifteen digits
    return format(Decimal(text), "f") if "e" in text else text


def _moment(value: datetime, number_format: str) -> str:
    whole = _nearest_second(value)
    midnight = (whole.hour, whole.minute, whole.second) == (0, 0, 0)
    if midnight and number_format and "h" not in number_format.lower():
        return whole.date().isoformat()
    return whole.isoformat(timespec="seconds" if whole.second else "minutes")


def _nearest_second(value: datetime) -> datetime:
    """Undo what storing days as a fraction does to a time: 05:59:59.9999 was 06:00."""
    micro = value.microsecond
    return value.replace(microsecond=0) + timedelta(seconds=1 if micro >= 500_000 else 0)


def _length(value: timedelta) -> str:
    micro = round(value / timedelta(microseconds=1) / 1000) * 1000  # to a millisecond, for the same reason
    sign, rest = ("-", -micro) if micro < 0 else ("", micro)
    minutes, rest = divmod(rest, 60_000_000)
    text = f"{sign}{minutes // 60}:{minutes % 60:02d}"
    if not rest:
        return text
    seconds = f"{rest / 1e6:06.3f}".rstrip("0").rstrip(".")
    return f"{text}:{seconds}"
