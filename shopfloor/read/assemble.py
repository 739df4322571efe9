"""From the columns of an orders file to the parts of a shop."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from shopfloor.model.shop import (
    LEFT_OUT,
    NO_DUE,
    NO_FAMILY,
    NO_STEP,
    Bools,
    Floats,
    Ints,
    Machine,
    Operations,
    Orders,
    Shop,
)
from shopfloor.read.columns import Sheet
from shopfloor.read.floor import Floor
from shopfloor.read.headers import Suggestions
from shopfloor.read.remarks import notice_alike, notice_repeated
from shopfloor.read.rows import (
    NOBODY,
    names_of,
    notes_of,
    of_machine,
    or_default,
    per_order,
    per_row,
    report_due_before_release,
)
from shopfloor.read.times import run_times, set_up_times


@dataclass(frozen=True)
class Parts:
    """What the rows say, an entry a row or an order; where a fault was found a value may mean nothing."""

    orders: tuple[str, ...]
    release: Ints
    due: Ints
    priority: Floats
    machines: tuple[Machine, ...]
    families: tuple[str, ...]
    operations: dict[str, Any]
    unit_rounds: bool

    @property
    def sound(self) -> Bools:
        """Which rows say enough to be an operation."""
        columns = self.operations
        known: Bools = (columns["job"] != NOBODY) & (columns["machine"] != NOBODY) & (columns["seconds"] > 0)
        return known

    def shop(self, floor: Floor, crew: int | None, split: bool, rows: Bools | None = None) -> Shop:
        """Return the shop; with `rows`, only of them, and without what other faults may spoil."""
        kept = slice(None) if rows is None else rows
        crews = {crew.id for crew in floor.crews}
        shop = Shop(
            machines=self.machines
            if rows is None
            else tuple(m if m.crew in crews else replace(m, crew=None) for m in self.machines),
            orders=Orders(
                self.orders,
                release_s=np.maximum(self.release, 0),  # released before the shift is released when it starts
                due_s=self.due if rows is None else LEFT_OUT,
                priority=self.priority,
            ),
            operations=Operations(
                **{
                    name: values if values is None or name == "notes" else values[kept]
                    for name, values in self.operations.items()
                }
            ),
            crews=floor.crews,
            breaks=floor.breaks,
            families=self.families,
            changeovers={
                machine.id: floor.changeovers[machine.id]
                for machine in self.machines
                if machine.id in floor.changeovers
            },
            transport=floor.transport,
            clock=floor.clock,
            shift_end_s=floor.shift_end_s,
            unit_rounds=self.unit_rounds,
        )
        shop = shop.with_splits() if split else shop
        return shop if crew is None else shop.with_crew(crew)


def assemble(sheet: Sheet, floor: Floor, round_s: int) -> Parts:
    """Return what the rows say."""
    order_ids, job = names_of(sheet, "order")
    machine_ids, machine = names_of(sheet, "machine")
    machines = floor.machines
    if machines:
        index = {listed.id: position for position, listed in enumerate(machines)}
        if floor.draft.machines_known:
            _report_unknown(sheet, machine_ids, machine, floor)
        known = np.array([*(index.get(name, NOBODY) for name in machine_ids), NOBODY], np.int64)
        machine = known[machine]
    else:
        machines = tuple(Machine(name) for name in machine_ids)
        notice_alike(sheet, machine_ids, machine)
    families, family = names_of(sheet, "family")
    seconds, unit_rounds = run_times(sheet, round_s)
    setup_s = set_up_times(sheet, of_machine(machines, floor.setup_s, 0)[machine])
    notice_repeated(sheet, order_ids, job, machines, machine)

    size = len(order_ids)
    release = per_order(sheet, "release", job, size, 0, np.int64)
    due = per_order(sheet, "due", job, size, NO_DUE, np.int64)
    report_due_before_release(sheet, order_ids, job, release, due)
    return Parts(
        order_ids,
        release,
        due,
        per_order(sheet, "priority", job, size, 1.0, np.float64),
        machines,
        families,
        {
            "job": job,
            "machine": machine,
            "seconds": np.where(seconds > 0, seconds + setup_s, 0),
            "step": per_row(sheet, "step", NO_STEP),
            "splittable": per_row(sheet, "splittable", 0),
            "heads": or_default(sheet, "heads", of_machine(machines, floor.heads, 1)[machine]),
            "family": np.where(family == NOBODY, NO_FAMILY, family),
            "setup_s": setup_s,
            "row": sheet.cells.row,
            "notes": notes_of(sheet),
        },
        unit_rounds and not setup_s.any(),
    )


def _report_unknown(sheet: Sheet, names: tuple[str, ...], machine: Ints, floor: Floor) -> None:
    near = Suggestions(entry.id for entry in floor.machines)
    unknown = np.array([*(name not in near.among for name in names), False], np.bool_)

    def words(row: int) -> dict[str, Any]:
        close = near.nearest(names[machine[row]])
        return {
            "floor": floor.draft.file,
            "nearest": f"write {close!r} if that is meant, " if close else "",
        }

    sheet.fault_rows(np.flatnonzero(unknown[machine]), "machine-unknown", "machine", words)
