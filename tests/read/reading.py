"""What the tests of reading share: the faults or the shop of some text."""

from __future__ import annotations

from typing import Any

import hypothesis
import pytest

from shopfloor.errors import InputError
from shopfloor.model.results import Fault
from shopfloor.model.shop import Shop
from shopfloor.read.orders import Reading, load

START = "2026-03-02T06:00"
patient = hypothesis.settings(deadline=None)  # a busy machine is no fault


def encode(text: str | bytes) -> bytes:
    """Return the bytes of a test's text."""
    return text.encode() if isinstance(text, str) else text


def reading(text: str | bytes, *, shop: str | None = None, **options: Any) -> Reading:
    """Load orders (and shop.toml) given as text."""
    if shop is not None:
        options["shop"] = _Named("shop.toml", shop)
    return load(encode(text), name="orders.csv", **options)


def shop_of(text: str | bytes, **options: Any) -> Shop:
    """Return the shop of orders given as text."""
    return reading(text, **options).shop


def faults_of(text: str | bytes, **options: Any) -> tuple[Fault, ...]:
    """Return the faults of orders given as text; there must be some."""
    with pytest.raises(InputError) as caught:
        reading(text, **options)
    return caught.value.faults


def rules_of(text: str | bytes, **options: Any) -> list[str]:
    """Return the codes of the faults."""
    return [fault.rule for fault in faults_of(text, **options)]


def texts_of(text: str | bytes, **options: Any) -> list[str]:
    """Return the faults as users read them."""
    return [fault.text() for fault in faults_of(text, **options)]


def notices_of(text: str | bytes, **options: Any) -> list[str]:
    """Return the notices as users read them."""
    return [notice.text() for notice in reading(text, **options).notices]


class _Named:
    """An open binary file with a name."""

    def __init__(self, name: str, text: str) -> None:
        self.name = name
        self._data = text.encode()

    def read(self, size: int = -1) -> bytes:
        data, self._data = (self._data, b"") if size < 0 else (self._data[:size], self._data[size:])
        return data
