"""A plan as somebody states it: rows read from a file, or our own schedule before it is believed.

The audit sees only this and the shop, so a plan edited by hand and a plan just made are judged alike.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from shopfloor.model.schedule import NO_ROUND
from shopfloor.model.shop import Ints

if TYPE_CHECKING:
    from shopfloor.model.results import Bound, Plan


@dataclass(frozen=True, eq=False)
class StatedPlan:
    """Rows as columns, in the order of the file, and what the file claims about them.

    Attributes
    ----------
    row
        Row number of each assignment in its file, for messages.
    order, machine
        Names as stated; they may be unknown to the shop.
    unit, start_s, end_s, round, part, parts
        As in :class:`Schedule`; nothing about them has been checked.
    makespan_s, lower_bound_s, proved_optimal, fits_shift
        Claims, or None where the file makes none (plan.csv makes none).
    bounds
        Claimed bounds with their witnesses.
    """

    row: Ints
    order: Sequence[str]
    machine: Sequence[str]
    unit: Ints
    start_s: Ints
    end_s: Ints
    round: Ints
    part: Ints
    parts: Ints
    makespan_s: int | None = None
    lower_bound_s: int | None = None
    proved_optimal: bool | None = None
    fits_shift: bool | None = None
    bounds: tuple[Bound, ...] = ()

    def __post_init__(self) -> None:
        for name in ("row", "unit", "start_s", "end_s", "round", "part", "parts"):
            values: Any = np.array(getattr(self, name), dtype=np.int64)
            if values.shape != (len(self.order),):
                raise ValueError(f"{name} has {values.shape} values for {len(self.order)} rows")
            object.__setattr__(self, name, values)

    def __len__(self) -> int:
        return len(self.order)

    def has_round(self, index: int) -> bool:
        """Whether row `index` states a round."""
        return bool(self.round[index] != NO_ROUND)


def state(plan: Plan) -> StatedPlan:
    """Return `plan` as it will stand in plan.csv and plan.json; row 2 is the first, under the header."""
    shop, schedule = plan.shop, plan.schedule
    order_ids = np.array(shop.orders.ids, dtype=object)
    machine_ids = np.array([machine.id for machine in shop.machines], dtype=object)
    return StatedPlan(
        row=np.arange(2, len(schedule) + 2),
        order=order_ids[shop.operations.job[schedule.operation]].tolist() if len(schedule) else [],
        machine=machine_ids[shop.operations.machine[schedule.operation]].tolist() if len(schedule) else [],
        unit=schedule.unit,
        start_s=schedule.start_s,
        end_s=schedule.end_s,
        round=schedule.round,
        part=schedule.part,
        parts=schedule.parts,
        makespan_s=plan.makespan_s,
        lower_bound_s=plan.lower_bound_s,
        proved_optimal=plan.proved_optimal,
        fits_shift=plan.fits_shift,
        bounds=plan.bounds,
    )
