"""Proof that no plan exists, and a least set of rules that clash: none of them can be left out of the proof.

The set is found by dividing (QuickXplain: U. Junker, AAAI-04 (2004) 167-172): some k of n rules take about
k log(n / k) questions to the exact model of the floor. Each question, whether the shop without some rules
has a plan, is put to one thread and limited in the solver's own units, so that the answer repeats.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

import numpy as np
from ortools.sat.python import cp_model

from shopfloor.model.calendar import duration
from shopfloor.model.shop import Shop
from shopfloor.openshop.clash import Rule, circles, limited, rules_of, say, without
from shopfloor.openshop.cpsat.floor.best import Places
from shopfloor.openshop.cpsat.floor.rules import add_rules
from shopfloor.openshop.cpsat.floor.solve import whole_horizon_s
from shopfloor.openshop.cpsat.floor.variables import Model

OPERATIONS_MOST = 1_000  # limited operations; beyond, the question is not put
SHOWN = 10  # operations in a message
WORK = 1.0  # for one question, in the solver's own units


@dataclass(frozen=True, slots=True)
class Clash:
    """Rules that no plan keeps together.

    Attributes
    ----------
    shop
        The limited operations that the rules belong to.
    rules
        Those that clash: with any one of them given up, the rest go together, if `least`.
    least
        Whether that is proved of each of them.
    enough
        Those of which one alone, given up, makes a plan of the whole shop possible.
    """

    shop: Shop
    rules: tuple[Rule, ...]
    least: bool
    enough: tuple[Rule, ...] = field(default=())

    def text(self) -> str:
        """Return what clashes and what would help, a line a rule."""
        every = len(self.enough) == len(self.rules)
        lines = ["no plan can keep all of this together:"]
        for rule in self._shown():
            mark = "*" if rule in self.enough and not every else "-"
            lines.append(f"  {mark} {say(self.shop, rule)}")
        lines += self._others()
        if every:
            lines.append("With any one of them eased far enough there is a plan.")
        elif self.enough:
            lines.append(
                "With one marked * eased far enough there is a plan; behind the others more clashes."
            )
        else:
            lines.append("To ease one of them is not enough, as far as is known: more clashes behind them.")
        if not self.least:
            lines.append("Some of them may have nothing to do with it: time ran out before all were tried.")
        return "\n".join(lines)

    def _shown(self) -> list[Rule]:
        """Return the rules to print: of the operations only the longest, but all that alone are enough."""
        long = set(self._by_length()[:SHOWN])
        return [r for r in self.rules if r.kind != "operation" or r in long or r in self.enough[:SHOWN]]

    def _others(self) -> list[str]:
        """Return a line on the operations that are not printed."""
        shown = set(self._shown())
        rest = [rule.of for rule in self.rules if rule not in shown]
        if not rest:
            return []
        columns = self.shop.operations
        names = [self.shop.machines[index].id for index in np.unique(columns.machine[rest]).tolist()]
        where = names[0] if len(names) == 1 else f"{len(names)} machines"
        together = duration(int(columns.seconds[rest].sum()))
        noun = "operation" if len(rest) == 1 else "operations"
        return [f"  - {len(rest)} more {noun} on {where}, {together} in all"]

    def _by_length(self) -> list[Rule]:
        seconds = self.shop.operations.seconds
        rows = [rule for rule in self.rules if rule.kind == "operation"]
        return sorted(rows, key=lambda rule: (-int(seconds[rule.of]), rule.of))


def judge(shop: Shop, over: Callable[[], bool] = lambda: False) -> Clash | bool | None:
    """Return a set of rules that no plan of `shop` keeps together; True if there is a plan; else None.

    Parameters
    ----------
    over
        Asked between questions whether to stop; what is known by then is returned.
    """
    chosen = limited(shop)
    if np.count_nonzero(chosen) > OPERATIONS_MOST:
        return None
    part = shop.keep(chosen)
    possible = has_plan(part)
    if possible:
        return None if shop.has_splits else True
    rules = rules_of(part)
    search = _Search(part, rules, over)
    near = (circle for circle in circles(part, rules) if not over() and search.clashes(circle))
    around = next(near, rules if possible is False else None)
    if around is None:
        return None
    # what comes last is done without first: short operations
    kinds, seconds = [rule.kind for rule in rules], part.operations.seconds.tolist()
    found = search.explain(
        sorted(around, key=lambda r: (kinds.index(r.kind), -seconds[r.of] if r.kind == "operation" else 0))
    )
    enough = tuple(rule for rule in found if not over() and has_plan(without(part, [rule])))
    return Clash(part, tuple(sorted(found, key=rules.index)), search.certain, enough)


def has_plan(shop: Shop) -> bool | None:
    """Return whether a shop has a plan of whole operations; None if neither was found in the time given.

    Nobody waits for what is shut for good.
    """
    if not len(shop):
        return True
    nowhere = np.zeros(len(shop), np.int64)
    model = Model(shop, Places(nowhere, shop.operations.seconds, nowhere + 1), whole_horizon_s(shop))
    add_rules(model)
    solver = cp_model.CpSolver()
    solver.parameters.num_workers = 1
    solver.parameters.max_deterministic_time = WORK
    solver.parameters.catch_sigint_signal = False
    status = solver.solve(model.cp)
    return {cp_model.OPTIMAL: True, cp_model.FEASIBLE: True, cp_model.INFEASIBLE: False}.get(status)


class _Search:
    """Divides the rules until a least set of them is left that has no plan."""

    def __init__(self, shop: Shop, rules: Sequence[Rule], over: Callable[[], bool]) -> None:
        self.shop, self.rules, self.over = shop, rules, over
        self.certain = True

    def explain(self, rules: Sequence[Rule]) -> list[Rule]:
        """Return a least set of `rules`, which clash, that clashes."""
        self.certain = True
        return self._among([], [], list(rules))

    def _among(self, kept: list[Rule], added: list[Rule], rules: list[Rule]) -> list[Rule]:
        """Return those of `rules` that clash together with all that is `kept`; `added` was kept last."""
        if added and self.clashes(kept):
            return []
        if len(rules) == 1:
            return rules
        half = len(rules) // 2
        first, second = rules[:half], rules[half:]
        from_second = self._among([*kept, *first], first, second)
        from_first = self._among([*kept, *from_second], from_second, first)
        return [*from_first, *from_second]

    def clashes(self, kept: list[Rule]) -> bool:
        """Whether it is proved that no plan keeps these rules."""
        if self.over():
            self.certain = False
            return False
        answer = has_plan(without(self.shop, set(self.rules).difference(kept)))
        self.certain &= answer is not None
        return answer is False
