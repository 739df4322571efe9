"""Unit rounds under a crew of c: even rounds, still optimal.

With at most c operations at once, m operations need at least ⌈m/c⌉ rounds, and at least Δ. In
k = max(Δ, ⌈m/c⌉) rounds a colouring exists whose rounds differ by at most one operation in size
(D. de Werra, INFOR 9 (1971); C. McDiarmid, J. Inst. Maths Applics 10 (1972) 161-165), so none holds
more than ⌈m/k⌉ ≤ c. Groups are dealt out to units first, as in `unit_rounds`.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from shopfloor.kernel.equitable import even_rounds
from shopfloor.model.results import Outcome
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Shop
from shopfloor.openshop.method import Effort
from shopfloor.openshop.unit_rounds import deal_out, rounds_to_outcome, why_not_unit


@dataclass(frozen=True, slots=True)
class CrewRounds:
    """Exact for unit-time shops whose operations all take the same heads from one crew."""

    name: str = "crew rounds"
    reaches_bound: bool = True

    def accepts(self, shop: Shop) -> str | None:
        """Return None, or why the crew does not make a unit-time shop with one limit on what runs at once."""
        if not shop.crews or not len(shop):
            return "no crew limits how much runs at once"
        used = {shop.machines[index].crew for index in np.unique(shop.operations.machine).tolist()}
        if len(used) > 1:
            return "not every operation takes its heads from the same crew"
        if any(crew.levels for crew in shop.crews):
            return "the crew is not always equally many"
        if any(machine.set_up_only for machine in shop.machines):
            return "the crew attends only set-ups"
        heads = shop.operations.heads
        if int(heads.min()) != int(heads.max()):
            # Rounds that hold what c heads can attend are then a packing problem: exactness ends here.
            return f"operations take different numbers of heads ({int(heads.min())} to {int(heads.max())})"
        if int(heads[0]) > _crew_heads(shop):
            return f"one operation needs {int(heads[0])} heads of a crew of {_crew_heads(shop)}"
        if shop.has_splits:
            return "cutting operations uses the crew better"
        return why_not_unit(without_crews(shop))

    def promise(self, shop: Shop) -> str:
        """Return the theorem in a sentence."""
        return (
            f"all operations are equally long and {_at_once(shop)} can run at once, so as many rounds as "
            "the busiest order or machine has operations, or as the crew needs for all, whichever is more, "
            "always suffice (de Werra 1971, McDiarmid 1972)"
        )

    def solve(self, shop: Shop, effort: Effort) -> Outcome:
        """Return a schedule in the fewest rounds, each within the crew, in a good order for the due times."""
        if not len(shop):
            return Outcome(Schedule(*(np.zeros(0, np.int64),) * 3))
        node, unit = deal_out(shop)
        colour = even_rounds(shop.operations.job, node, _at_once(shop), seed=effort.seed)
        return rounds_to_outcome(shop, unit, colour)


def without_crews(shop: Shop) -> Shop:
    """Return the shop with all the people it wants."""
    return replace(shop, machines=tuple(replace(machine, crew=None) for machine in shop.machines), crews=())


def _crew_heads(shop: Shop) -> int:
    name = shop.machines[int(shop.operations.machine[0])].crew
    return next((crew.heads for crew in shop.crews if crew.id == name), len(shop))


def _at_once(shop: Shop) -> int:
    heads = int(shop.operations.heads[0]) if len(shop) else 1
    return _crew_heads(shop) // heads if heads else len(shop)
