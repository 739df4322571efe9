"""The general method: list schedules first."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from shopfloor.model.results import Outcome
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Shop
from shopfloor.openshop.incumbent import GOALS, MAKESPAN, TARDINESS, Incumbent
from shopfloor.openshop.list_rule import list_schedules
from shopfloor.openshop.method import Effort


@dataclass(frozen=True, slots=True)
class General:
    """Accepts what the exact methods refuse."""

    goals: tuple[str, ...] = GOALS
    name: str = "general"
    reaches_bound: bool = False

    def accepts(self, shop: Shop) -> str | None:
        """Return None: every shop has a list schedule."""
        return None

    def promise(self, shop: Shop) -> str:
        """Return what the method guarantees."""
        return "a list schedule that is optimal where it meets a lower bound, and has a proved gap elsewhere"

    def solve(self, shop: Shop, effort: Effort) -> Outcome:
        """Return the best schedule found."""
        if not len(shop):
            return Outcome(Schedule(*(np.zeros(0, np.int64),) * 3))
        incumbent = Incumbent(shop, self.goals)
        complete = list_schedules(
            shop, incumbent, MAKESPAN, effort.bound_s, seed=effort.seed, over=lambda: effort.over
        )
        if shop.has_due:
            complete &= list_schedules(
                shop, incumbent, TARDINESS, incumbent.value(MAKESPAN), over=lambda: effort.over
            )
        return Outcome(incumbent.schedule(), repeatable=complete)
