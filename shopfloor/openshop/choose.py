"""Which method makes the plan: the first that accepts the shop, and a sentence on each that did not."""

from __future__ import annotations

from shopfloor.model.results import Choice
from shopfloor.model.shop import Shop
from shopfloor.openshop.crew_rounds import CrewRounds
from shopfloor.openshop.general import General
from shopfloor.openshop.incumbent import GOALS, MAKESPAN
from shopfloor.openshop.lot_split import LotSplit
from shopfloor.openshop.method import Method
from shopfloor.openshop.over_breaks import OverBreaks, all_pause
from shopfloor.openshop.two_machine import TwoMachine
from shopfloor.openshop.unit_rounds import UnitRounds
from shopfloor.openshop.whole_floor import WholeFloor


def methods(goals: tuple[str, ...] = GOALS) -> tuple[Method, ...]:
    """Return every method: exact ones first, in the order of the README's table; the last accepts all."""
    simple = tuple(goal for goal in goals if goal in GOALS)  # without changeovers there are none to shorten
    return UnitRounds(), CrewRounds(), TwoMachine(), LotSplit(), General(simple), WholeFloor(goals)


def choose(shop: Shop, goals: tuple[str, ...] = GOALS) -> tuple[Method, Choice]:
    """Return the first method that accepts `shop`, with the reasons for and against.

    Parameters
    ----------
    goals
        What counts first, and what then. The exact methods serve the makespan first.
    """
    refused: dict[str, str] = {}
    for method in methods(goals):
        chosen = OverBreaks(method) if all_pause(shop) else method
        reason = chosen.accepts(shop)
        if reason is None and chosen.reaches_bound and goals[0] != MAKESPAN and shop.has_due:
            reason = f"it serves the finish first, not {goals[0]}"
        if reason is None:
            return chosen, Choice(chosen.name, chosen.promise(shop), refused)
        refused[chosen.name] = reason
    raise AssertionError("the last method accepts every shop")
