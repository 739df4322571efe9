"""Breaks that the whole hall shares, on machines whose work pauses: taken out of the clock and put back.

When every machine stops for the same breaks and goes on afterwards, nothing happens in them at all. So
a plan with breaks is a plan in working time, moment for moment: an operation ends by a due time exactly
when its working time ends by the working time before it. Whatever a method proves in working time
therefore holds on the clock.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from shopfloor.model.results import Outcome
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import NO_DUE, Orders, Shop
from shopfloor.openshop.method import Effort, Method, Progress

IN_WORKING_TIME = "Lateness is weighed in working time here: breaks that an order waits over do not count."


def all_pause(shop: Shop) -> bool:
    """Whether nothing happens in the hall's breaks: every machine pauses, and no other clock runs on."""
    return (
        bool(shop.breaks)
        and all(machine.pauses and not machine.closed for machine in shop.machines)
        and all(not crew.levels for crew in shop.crews)
        and shop.transport.none
    )


@dataclass(frozen=True, slots=True)
class OverBreaks:
    """A method on working time: `inner` never sees the breaks."""

    inner: Method

    @property
    def name(self) -> str:
        """The name of the method inside."""
        return self.inner.name

    @property
    def reaches_bound(self) -> bool:
        """As the method inside."""
        return self.inner.reaches_bound

    def accepts(self, shop: Shop) -> str | None:
        """Return what the method inside says of the shop in working time."""
        return self.inner.accepts(squeeze(shop))

    def promise(self, shop: Shop) -> str:
        """Return the promise of the method inside, and what was done with the breaks."""
        return (
            f"{self.inner.promise(squeeze(shop))}; every machine pauses for the same breaks, so they were "
            "taken out of the clock and put back"
        )

    def solve(self, shop: Shop, effort: Effort) -> Outcome:
        """Solve in working time and put the answer back on the clock."""
        clock = shop.work_clock

        def report(progress: Progress) -> None:
            best = None if progress.best_s is None else int(clock.end(progress.best_s))
            effort.report(replace(progress, best_s=best, bound_s=int(clock.end(progress.bound_s))))

        inside = replace(effort, bound_s=int(clock.worked(effort.bound_s)), report=report)
        outcome = self.inner.solve(squeeze(shop), inside)
        if outcome.schedule is None:
            return outcome
        rows = outcome.schedule
        schedule = Schedule(
            rows.operation, clock.start(rows.start_s), clock.end(rows.end_s), unit=rows.unit, round=rows.round
        )
        proven = int(clock.end(outcome.proven_s)) if outcome.proven_s else 0
        finish = schedule.completion_s(shop.operations.job, len(shop.orders))
        late = bool((finish > shop.orders.due_s).any())
        remarks = (*outcome.remarks, *([IN_WORKING_TIME] if late else []))
        return replace(outcome, schedule=schedule, proven_s=proven, remarks=remarks)


def squeeze(shop: Shop) -> Shop:
    """Return the shop in working time: no breaks, releases and due times moved by the breaks before them."""
    clock, orders = shop.work_clock, shop.orders
    due = np.where(
        orders.due_s == NO_DUE, NO_DUE, clock.worked(np.where(orders.due_s == NO_DUE, 0, orders.due_s))
    )
    return replace(
        shop,
        orders=Orders(orders.ids, clock.worked(orders.release_s), due, orders.priority),
        breaks=(),
        shift_end_s=None,
    )
