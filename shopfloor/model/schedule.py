"""A schedule: what runs where, from when to when, held as columns in one stable order."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

import numpy as np

from shopfloor.errors import ShopError
from shopfloor.model.shop import LEFT_OUT, Ints

NO_ROUND = -1  # outside unit rounds


@dataclass(frozen=True, slots=True)
class Assignment:
    """One piece of one operation on one unit. A view of one row of :class:`Schedule`.

    `unit` counts from 1; `round` from 1, or is None outside unit rounds; `part` of `parts` counts from 1.
    """

    operation: int
    unit: int
    start_s: int
    end_s: int
    round: int | None
    part: int
    parts: int


@dataclass(frozen=True, eq=False)
class Schedule:
    """Assignments as columns, sorted by start, operation and part, so that equal plans are equal bytes.

    Parameters
    ----------
    operation
        Index of the operation in its shop.
    start_s, end_s
        Whole seconds since the shift's start.
    unit
        1 … count of the machine; all ones when left out.
    round
        1 …, or ``NO_ROUND``; left out outside unit rounds.
    part, parts
        Numbered here from the starts: the pieces of one operation are part 1 … parts.
    """

    operation: Ints
    start_s: Ints
    end_s: Ints
    unit: Ints = field(default=LEFT_OUT)
    round: Ints = field(default=LEFT_OUT)
    part: Ints = field(init=False)
    parts: Ints = field(init=False)

    def __post_init__(self) -> None:
        size = len(self.operation)
        unit = np.ones(size, np.int64) if self.unit is None else self.unit
        rounds = np.full(size, NO_ROUND, np.int64) if self.round is None else self.round
        columns: dict[str, Any] = {
            "operation": self.operation,
            "start_s": self.start_s,
            "end_s": self.end_s,
            "unit": unit,
            "round": rounds,
        }
        columns = {name: np.array(values, dtype=np.int64) for name, values in columns.items()}
        if any(values.shape != (size,) for values in columns.values()):
            raise ShopError("the columns of a schedule differ in length")
        order = np.lexsort((columns["operation"], columns["start_s"]))
        columns = {name: values[order] for name, values in columns.items()}
        columns["part"], columns["parts"] = _number_parts(columns["operation"])
        for name, values in columns.items():
            values.flags.writeable = False
            object.__setattr__(self, name, values)

    def __len__(self) -> int:
        return len(self.operation)

    def __getitem__(self, index: int) -> Assignment:
        rank = int(self.round[index])
        return Assignment(
            operation=int(self.operation[index]),
            unit=int(self.unit[index]),
            start_s=int(self.start_s[index]),
            end_s=int(self.end_s[index]),
            round=None if rank == NO_ROUND else rank,
            part=int(self.part[index]),
            parts=int(self.parts[index]),
        )

    def __iter__(self) -> Iterator[Assignment]:
        return (self[index] for index in range(len(self)))

    @cached_property
    def makespan_s(self) -> int:
        """Finish of the last operation, measured from the shift's start; 0 for an empty schedule."""
        return int(self.end_s.max()) if len(self) else 0

    def completion_s(self, job: Ints, orders: int) -> Ints:
        """Finish of each order, given each operation's order; 0 for an order without operations."""
        done = np.zeros(orders, np.int64)
        np.maximum.at(done, job[self.operation], self.end_s)
        return done


def _number_parts(operation: Ints) -> tuple[Ints, Ints]:
    """Number the pieces of each operation 1 … n in the order given."""
    size = len(operation)
    order = np.argsort(operation, kind="stable")
    ranked = operation[order]
    first = np.r_[True, ranked[1:] != ranked[:-1]] if size else np.zeros(0, bool)
    begins = np.flatnonzero(first)
    group = np.cumsum(first) - 1
    part, parts = np.empty(size, np.int64), np.empty(size, np.int64)
    part[order] = np.arange(size) - begins[group] + 1 if size else 0
    parts[order] = np.diff(np.r_[begins, size])[group] if size else 0
    return part, parts
