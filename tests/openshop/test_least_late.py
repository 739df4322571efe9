"""Methods ask for a lower bound of lateness once a plan is late, of the very shop they plan."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from shopfloor.bounds.lateness import least_lateness
from shopfloor.model.shop import Closure, Shop, shop_of
from shopfloor.openshop.general import General
from shopfloor.openshop.incumbent import TARDINESS
from shopfloor.openshop.method import Effort
from shopfloor.openshop.over_breaks import OverBreaks, squeeze

HOUR = 3600


def one_machine(due_s: int) -> Shop:
    """Three orders of an hour on one machine, wanted at the same time."""
    shop = shop_of([[HOUR], [HOUR], [HOUR]])
    return replace(shop, orders=replace(shop.orders, due_s=np.full(3, due_s)))


def test_a_late_plan_is_told_beside_what_every_plan_has() -> None:
    """No time for the solver: what is said rests on the bound."""
    asked: list[Shop] = []

    def least(shop: Shop) -> int:
        asked.append(shop)
        return 1_000 * 2 * HOUR

    shop = one_machine(HOUR)
    outcome = General((TARDINESS,)).solve(shop, Effort(time_limit_s=0, least_late=least))
    assert outcome.remarks == (
        "Weighted lateness is 3 h (priority × time late, summed); all that is proved is that every plan has "
        "2 h or more.",
    )
    assert asked == [shop]


def test_a_plan_that_meets_the_bound_is_proved() -> None:
    shop = one_machine(HOUR)
    outcome = General((TARDINESS,)).solve(shop, Effort(time_limit_s=0, least_late=lambda _: 3_000 * HOUR))
    assert outcome.remarks == ("Weighted lateness is 3 h (priority × time late, summed); no plan has less.",)


def test_nothing_is_asked_while_nothing_is_late() -> None:
    def never(shop: Shop) -> int:
        raise AssertionError("asked")

    outcome = General((TARDINESS,)).solve(one_machine(3 * HOUR), Effort(time_limit_s=0, least_late=never))
    assert outcome.remarks == ("Nothing is late.",)


def test_a_method_without_breaks_asks_of_the_shop_without_breaks() -> None:
    """Lateness in working time is less than on the clock, and so is its bound."""
    asked: list[int] = []

    def least(shop: Shop) -> int:
        asked.append(least_lateness(shop).value)
        return asked[-1]

    shop = replace(one_machine(HOUR), breaks=(Closure(HOUR, 2 * HOUR),))
    machines = tuple(replace(machine, pauses=True) for machine in shop.machines)
    shop = replace(shop, machines=machines)
    OverBreaks(General((TARDINESS,))).solve(shop, Effort(time_limit_s=0, least_late=least))
    assert asked == [least_lateness(squeeze(shop)).value]
    assert asked[0] <= 3_000 * HOUR < least_lateness(shop).value <= 5_000 * HOUR
