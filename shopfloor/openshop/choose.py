"""Which method makes the plan: the first that accepts the shop, and a sentence on each that did not."""

from __future__ import annotations

from shopfloor.model.results import Choice
from shopfloor.model.shop import Shop
from shopfloor.openshop.crew_rounds import CrewRounds
from shopfloor.openshop.general import General
from shopfloor.openshop.lot_split import LotSplit
from shopfloor.openshop.method import Method
from shopfloor.openshop.over_breaks import OverBreaks, all_pause
from shopfloor.openshop.two_machine import TwoMachine
from shopfloor.openshop.unit_rounds import UnitRounds

# Exact methods first, in the order of the README's table; the last accepts everything.
METHODS: tuple[Method, ...] = (UnitRounds(), CrewRounds(), TwoMachine(), LotSplit(), General())


def choose(shop: Shop) -> tuple[Method, Choice]:
    """Return the first method that accepts `shop`, with the reasons for and against."""
    refused: dict[str, str] = {}
    methods = [OverBreaks(method) for method in METHODS] if all_pause(shop) else METHODS
    for method in methods:
        reason = method.accepts(shop)
        if reason is None:
            return method, Choice(method.name, method.promise(shop), refused)
        refused[method.name] = reason
    raise AssertionError("the general method accepts every shop")
