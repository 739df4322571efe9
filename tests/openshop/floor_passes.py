"""What tests of floors share: some list to begin with, and the audit of what a list came to."""

from __future__ import annotations

from random import Random

from shopfloor.audit.schedule import audit
from shopfloor.model.results import Choice, Plan
from shopfloor.model.shop import Shop
from shopfloor.model.stated import state
from shopfloor.openshop.floor.plan import schedule_of
from shopfloor.openshop.floor.rules import Rules
from shopfloor.openshop.floor.sequence import Pass, Sequencer


def some_list(shop: Shop, random: Random) -> Pass:
    """What a list of all operations comes to, drawn at random but for the steps of each order."""
    step = shop.operations.step.tolist()
    made = Sequencer(Rules.of(shop)).whole(sorted(range(len(shop)), key=lambda k: (step[k], random.random())))
    assert made is not None
    return made


def legal(shop: Shop, made: Pass) -> bool:
    """Whether the audit finds no rule broken."""
    return audit(shop, state(Plan(shop, schedule_of(shop, made), (), Choice("", "", {})))) == []
