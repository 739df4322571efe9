"""List schedules of floors: a grid of rules for each goal, then the best of them varied.

A list schedule is the image of its rule, of a few numbers and a bias for each order, so the rule is what is
varied, and each variant is a legal schedule (R. H. Storer, S. D. Wu, R. Vaccari, Management Science 38
(1992) 1495-1509). Every second variant only makes what came late more pressing, and runs again (D. E. Joslin,
D. P. Clements, J. of Artificial Intelligence Research 10 (1999) 353-373).
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace
from itertools import product
from math import exp
from random import Random

from shopfloor.model.shop import Shop
from shopfloor.openshop.floor.dispatch import Charges, Dispatch, Times
from shopfloor.openshop.floor.goals import MAKESPAN, TARDINESS, Kept, score, worth
from shopfloor.openshop.floor.indices import MakeIndex, apparent_cost, earliest_due, modified_due, most_work
from shopfloor.openshop.floor.rules import NONE, Rules
from shopfloor.openshop.floor.sequence import Pass, Sequencer
from shopfloor.openshop.floor.timetable import serial

# Patience and batches tried where there are changeovers: for any makespan, and for one that must not grow.
ANY_TIME = (0.1, 0.03, 0.3, 1.0), (0.0, 1.0)
IN_TIME = (0.1,), (0.0, 1.0, 2.0)
WORK, COST, DUE, MODIFIED = range(4)  # kinds of index
SHARES, STRENGTHS = (0.05, 0.3, 1.0), (0.1, 0.3, 0.6)  # how many orders are varied at once, and how much
LIFTS = (0.3, 1.0, 2.0)  # how much more pressing what came late is made


@dataclass(frozen=True, slots=True)
class Rule:
    """An index with its numbers, and what waits cost; see :mod:`~shopfloor.openshop.floor.indices`."""

    kind: int
    patience: tuple[float, ...]
    bias: tuple[float, ...]
    batch: float = 0.0
    look_ahead: float = 3.0
    flow: float = 1.0  # beside most work: how often its own time counts for an operation
    pull: float = 0.01

    def index(self, deadline: int) -> MakeIndex:
        """Return the index, which keeps `deadline` in view."""
        if self.kind == WORK:
            return most_work(self.flow)
        if self.kind == COST:
            return apparent_cost(self.look_ahead, self.flow, deadline, self.pull)
        return earliest_due(deadline) if self.kind == DUE else modified_due(deadline)

    def times(self, rules: Rules, deadline: int) -> Times | None:
        """Return the list schedule of this rule."""
        charges = Charges(self.patience, self.batch, self.bias)
        return Dispatch(rules, self.index(deadline), charges).run()

    def vary(self, rules: Rules, rng: Random) -> Rule:
        """Return a neighbour of this rule."""
        share, strength = rng.choice(SHARES), rng.choice(STRENGTHS)
        bias = tuple(each + rng.gauss(0.0, strength) if rng.random() < share else each for each in self.bias)
        return self._vary_numbers(rules, rng, bias)

    def lift(self, rules: Rules, rng: Random, late: list[bool]) -> Rule:
        """Return a rule that finds what was late more pressing."""
        by = rng.choice(LIFTS)
        bias = tuple(
            each + by * rng.random() if was and rng.random() < 0.7 else each
            for each, was in zip(self.bias, late, strict=True)
        )
        return replace(self, bias=bias) if rng.random() < 0.5 else self._vary_numbers(rules, rng, bias)

    def _vary_numbers(self, rules: Rules, rng: Random, bias: tuple[float, ...]) -> Rule:
        def scaled(value: float, spread: float, low: float, high: float) -> float:
            return min(high, max(low, value * exp(rng.gauss(0.0, spread))))

        patience = tuple(
            scaled(each, 0.4, 0.01, 10.0) if change is not None and rng.random() < 0.5 else each
            for each, change in zip(self.patience, rules.change, strict=True)
        )
        return replace(
            self,
            bias=bias,
            patience=patience,
            batch=max(0.0, self.batch + rng.gauss(0.0, 0.3)) if rng.random() < 0.5 else self.batch,
            look_ahead=scaled(self.look_ahead, 0.3, 0.2, 10.0),
            flow=min(2.0, max(0.0, self.flow + rng.gauss(0.0, 0.2))),
            pull=scaled(self.pull, 0.3, 0.001, 100.0),
        )


def grid(rules: Rules, goal: str, *, in_time: bool = False) -> Iterator[Rule]:
    """Yield the rules to try for a goal, the most promising first.

    Parameters
    ----------
    in_time
        Whether the makespan must not suffer: then due times are weighed against a common deadline.
    """
    level = (0.0,) * len(rules.release)
    waits = any(change is not None for change in rules.change)
    patience, batches = (IN_TIME if in_time else ANY_TIME) if waits else ((1.0,), (0.0,))
    for each, batch in product(patience, batches):
        even = Rule(WORK, (each,) * len(rules.count), level, batch)
        if goal != TARDINESS:
            yield replace(even, flow=0.0)
            yield replace(even, flow=0.5)
            yield replace(even, kind=COST, pull=1.0)
        elif in_time:
            for pull, (flow, look_ahead) in product((1.0, 0.1, 100.0), ((1.0, 3.0), (0.0, 3.0), (1.0, 10.0))):
                yield replace(even, kind=COST, flow=flow, look_ahead=look_ahead, pull=pull)
        else:
            for flow, look_ahead in ((1.0, 3.0), (0.0, 1.0), (1.0, 1.0)):
                yield replace(even, kind=COST, flow=flow, look_ahead=look_ahead)
            if not batch:
                yield replace(even, kind=DUE)
                yield replace(even, kind=MODIFIED)


class RuleSearch:
    """Tries rules for one goal, and keeps the best.

    Parameters
    ----------
    wanted
        The goal, and what counts among schedules that have the same of it.
    kept
        What goals served before may come to; a schedule that passes that counts as worse than any that
        does not.
    deadline
        A makespan that rules for due times keep in view.
    """

    def __init__(
        self, sequencer: Sequencer, wanted: Sequence[str], kept: Kept, deadline: int, rng: Random
    ) -> None:
        self.sequencer, self.rules, self.wanted, self.kept = sequencer, sequencer.rules, wanted, kept
        self.best: Pass | None = None
        self._deadline, self._rng = deadline, rng
        self._rule: Rule | None = None
        self._value: tuple[int, ...] = ()
        in_time = MAKESPAN in dict(kept.values)
        self._grid = list(grid(self.rules, wanted[0], in_time=in_time))
        self.size = len(self._grid)
        self._tried = 0

    def try_next(self) -> Pass | None:
        """Try the next rule of the grid, or a variant of the best; return its schedule, if it makes one."""
        rule = self._grid[self._tried] if self._tried < self.size else self._variant()
        self._tried += 1
        times = rule.times(self.rules, self._deadline)
        made = None if times is None else self.sequencer.whole(in_order(times.start))
        if made is not None:
            value = (*self.kept.excess(made), *score(made, self.wanted))
            if self.best is None or value <= self._value:
                self.best, self._rule, self._value = made, rule, value
        return made

    def _variant(self) -> Rule:
        rule = self._rule or self._grid[0]
        if self.best is not None and self.wanted[0] == TARDINESS and self._rng.random() < 0.5:
            late = [done > due for done, due in zip(self.best.done, self.rules.due, strict=True)]
            return rule.lift(self.rules, self._rng, late)
        return rule.vary(self.rules, self._rng)


def in_order(start: list[int]) -> list[int]:
    """Return the operations by start."""
    return sorted(range(len(start)), key=lambda operation: (start[operation], operation))


def rescue(sequencer: Sequencer) -> Pass | None:
    """Return a schedule that places first what needs most heads, where rules find none in time for it."""
    rules = sequencer.rules
    need = [heads if crew != NONE else 0 for heads, crew in zip(rules.heads, rules.crew, strict=True)]
    whole = [0] * len(rules.release)
    for job, heads in zip(rules.job, need, strict=True):
        whole[job] = max(whole[job], heads)
    for scarce in (need, [whole[job] for job in rules.job]):
        table = serial(rules, _upwards(rules, in_order([-heads for heads in scarce])))
        if table is not None:
            made = sequencer.whole(in_order([spot.start for spot in table.spots if spot is not None]))
            if made is not None:
                return made
    return None


def _upwards(rules: Rules, sequence: list[int]) -> list[int]:
    """Return the list with the steps of each order in order, in the places that they had together."""
    steps: dict[int, list[int]] = {}
    for operation in sequence:
        if rules.step[operation] != NONE:
            steps.setdefault(rules.job[operation], []).append(operation)
    turn = {job: iter(sorted(mine, key=lambda k: (rules.step[k], k))) for job, mine in steps.items()}
    return [k if rules.step[k] == NONE else next(turn[rules.job[k]]) for k in sequence]


def floor_schedules(
    shop: Shop,
    offer: Callable[[Pass], None],
    goal: str = MAKESPAN,
    target: int = 0,
    *,
    deadline: int = 0,
    kept: Kept | None = None,
    variants: int = 0,
    seed: int = 0,
    over: Callable[[], bool] = lambda: False,
) -> bool:
    """Offer one list schedule after the other: the grid of a goal, then variants of its best rule.

    Parameters
    ----------
    offer
        Called with each schedule.
    target
        As little of the goal as there can be: met, nothing more is tried.
    deadline
        A makespan that the rules keep in view, such as the best lower bound.
    kept
        What goals served before may come to.
    variants
        How many variants are tried after the grid.
    over
        Asked before each run but the first.

    Returns
    -------
    Whether every run was made, or the goal was met: then the same call repeats.
    """
    search = RuleSearch(Sequencer(Rules.of(shop)), (goal,), kept or Kept(), deadline, Random(seed))
    for number in range(search.size + variants if len(shop) else 0):
        if number and over():
            return False
        made = search.try_next()
        if made is not None:
            offer(made)
            if worth(made, goal) <= target and not any(search.kept.excess(made)):
                break
    return True
