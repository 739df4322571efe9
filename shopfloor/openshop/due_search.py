"""Lists for due times: a grid of rules, then the best of them varied, again and again.

A list schedule is the image of its rule, of two or three numbers and a bias for each order; so the rule
is what is varied, and each variant is a legal schedule. What is no worse is varied further. Learning
priorities for a fixed constructor goes back to R. H. Storer, S. D. Wu, R. Vaccari, Management Science 38
(1992) 1495-1509.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from functools import partial
from itertools import product

import numpy as np

from shopfloor.model.shop import Floats, Ints, Shop
from shopfloor.openshop.dense import ShopLists, starts
from shopfloor.openshop.due_rules import Index, MostUrgent, apparent_cost, earliest_due, modified_due
from shopfloor.openshop.holds import Holds
from shopfloor.openshop.incumbent import Incumbent

TIGHT = 2  # lines held for, where a rule holds at all
SHARES, STRENGTHS = (0.05, 0.3, 1.0), (0.1, 0.3, 0.6)  # how many orders are varied at once, and how much


@dataclass(frozen=True, slots=True)
class Rule:
    """Apparent tardiness cost, as in :func:`apparent_cost`, with a bias an order and lines held for."""

    pull: float
    flow: float
    look_ahead: float
    tight: int
    bias: Floats

    def vary(self, rng: np.random.Generator) -> Rule:
        """Return a neighbour of this rule."""
        touched = rng.random(len(self.bias)) < rng.choice(SHARES)
        return replace(
            self,
            flow=float(np.clip(self.flow + rng.normal(0.0, 0.2), 0.0, 2.0)),
            look_ahead=float(np.clip(self.look_ahead * np.exp(rng.normal(0.0, 0.3)), 0.2, 10.0)),
            pull=float(np.clip(self.pull * np.exp(rng.normal(0.0, 0.3)), 0.01, 100.0)),
            bias=self.bias + touched * rng.normal(0.0, rng.choice(STRENGTHS), len(self.bias)),
        )


def due_runs(shop: Shop, incumbent: Incumbent, deadline: int, seed: int) -> Iterator[Callable[[], Ints]]:
    """Yield runs for weighted tardiness without end, each keeping a makespan of `deadline` in view.

    The best so far is read from `incumbent`, which is to be offered each run's result before the next
    is asked for.
    """
    lists = ShopLists.of(shop)
    heaviest = float(shop.orders.priority.max())
    level = np.zeros(len(shop.orders))
    best, value = Rule(1.0, 1.0, 1.0, 0, level), None
    for tight in (0, TIGHT):
        for pull, flow, look_ahead in product((1.0, 0.1, 10.0), (1.0, 0.0), (1.0, 3.0)):
            rule = Rule(pull, flow, look_ahead, tight, level)
            result: list[Ints] = []
            yield partial(_run, shop, lists, rule, deadline, heaviest, result)
            if value is None or incumbent.measure(result[0]) < value:
                best, value = rule, incumbent.measure(result[0])
        for index in (modified_due(deadline), earliest_due(deadline)):
            yield partial(_urgent, shop, lists, index, None, deadline, tight)
    rng = np.random.default_rng(seed)
    while True:
        rule, result = best.vary(rng), []
        yield partial(_run, shop, lists, rule, deadline, heaviest, result)
        if value is None or incumbent.measure(result[0]) <= value:
            best, value = rule, incumbent.measure(result[0])


def _run(
    shop: Shop, lists: ShopLists, rule: Rule, deadline: int, heaviest: float, result: list[Ints]
) -> Ints:
    index = apparent_cost(rule.look_ahead, rule.flow, deadline, rule.pull * heaviest)
    bias = rule.bias[shop.operations.job]
    result.append(_urgent(shop, lists, index, bias, deadline, rule.tight))
    return result[0]


def _urgent(
    shop: Shop, lists: ShopLists, index: Index, bias: Floats | None, deadline: int, tight: int
) -> Ints:
    return starts(lists, MostUrgent(shop, index, bias), Holds(deadline, tight) if tight else None)
