"""Orders and operations as columns (NumPy arrays), so that a million of them is ordinary.

:class:`Operation` and :class:`Job` are views of one row, made on demand.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from shopfloor.errors import ShopError
from shopfloor.model.calendar import Ints

Floats = np.ndarray[Any, np.dtype[np.float64]]
Bools = np.ndarray[Any, np.dtype[np.bool_]]

NO_DUE = np.iinfo(np.int64).max  # an order without a due time is never late
LEFT_OUT: Any = None  # a column left out is filled with its blank when the frozen value is built
NO_FAMILY = -1
NO_STEP = -1  # an operation that may run at any time within its order


@dataclass(frozen=True, slots=True)
class Job:
    """One work order: a lot that travels together. A view of one row of :class:`Orders`."""

    id: str
    release_s: int
    due_s: int | None
    priority: float


@dataclass(frozen=True, slots=True)
class Operation:
    """One visit of an order to a machine. A view of one row of :class:`Operations`."""

    index: int
    job: int
    machine: int
    order: str
    machine_id: str
    seconds: int
    step: int | None
    splittable: bool
    heads: int
    family: str
    setup_s: int
    note: str
    row: int


def _column(values: Any, dtype: type, size: int, what: str) -> Any:
    array: Any = np.array(values, dtype=dtype, copy=True)
    if array.shape != (size,):
        raise ShopError(f"{what}: {array.shape} values for {size} rows")
    array.flags.writeable = False
    return array


@dataclass(frozen=True, eq=False)
class Orders:
    """The orders as columns, one entry an order, in order of first appearance."""

    ids: tuple[str, ...]
    release_s: Ints = field(default=LEFT_OUT)
    due_s: Ints = field(default=LEFT_OUT)
    priority: Floats = field(default=LEFT_OUT)

    def __post_init__(self) -> None:
        size = len(self.ids)
        for name, blank, dtype in (
            ("release_s", 0, np.int64),
            ("due_s", NO_DUE, np.int64),
            ("priority", 1.0, np.float64),
        ):
            given = getattr(self, name)
            values = np.full(size, blank, dtype) if given is None else given
            object.__setattr__(self, name, _column(values, dtype, size, f"orders.{name}"))

    def __len__(self) -> int:
        return len(self.ids)

    def __getitem__(self, index: int) -> Job:
        due = int(self.due_s[index])
        return Job(
            self.ids[index],
            int(self.release_s[index]),
            None if due == NO_DUE else due,
            float(self.priority[index]),
        )


@dataclass(frozen=True, eq=False)
class Operations:
    """The operations as columns, one entry an operation, in the order of the file.

    Attributes
    ----------
    job, machine
        Index into the shop's orders and machines.
    seconds
        Time on the machine, at least 1; begins with the set-up.
    step
        Rank inside the order, or ``NO_STEP``; lower ranks finish before higher ones start.
    splittable
        1 where the operation may be cut into parts, else 0.
    heads
        People it takes from its machine's crew while it runs; counts only where there is a crew.
    family
        Index into the shop's families, or ``NO_FAMILY``, which is a family of its own.
    setup_s
        How much of `seconds` is set-up, at its beginning.
    row
        Row of the orders file, for messages; 0 when the shop came from elsewhere.
    notes
        Sparse: operation index to note.
    """

    job: Ints
    machine: Ints
    seconds: Ints
    step: Ints = field(default=LEFT_OUT)
    splittable: Ints = field(default=LEFT_OUT)
    heads: Ints = field(default=LEFT_OUT)
    family: Ints = field(default=LEFT_OUT)
    setup_s: Ints = field(default=LEFT_OUT)
    row: Ints = field(default=LEFT_OUT)
    notes: Mapping[int, str] = field(default_factory=dict)

    def __post_init__(self) -> None:
        size = len(self.job)
        for name, blank in (
            ("job", 0),
            ("machine", 0),
            ("seconds", 0),
            ("step", NO_STEP),
            ("splittable", 0),
            ("heads", 1),
            ("family", NO_FAMILY),
            ("setup_s", 0),
            ("row", 0),
        ):
            given = getattr(self, name)
            values = np.full(size, blank, np.int64) if given is None else given
            object.__setattr__(self, name, _column(values, np.int64, size, f"operations.{name}"))

    def __len__(self) -> int:
        return len(self.job)
