"""One floor to one plan: list schedules and improvement, goal after goal, until time is up."""

from __future__ import annotations

import time
from random import Random

import numpy as np

from shopfloor.model.results import Outcome
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Shop
from shopfloor.openshop.floor.goals import MAKESPAN, Kept, has, least, score, worth
from shopfloor.openshop.floor.improve import HEATS, closed_up, improve
from shopfloor.openshop.floor.list_rule import RuleSearch, rescue
from shopfloor.openshop.floor.moves import Moves
from shopfloor.openshop.floor.rules import NONE, Rules
from shopfloor.openshop.floor.sequence import Pass, Sequencer
from shopfloor.openshop.incumbent import GOALS
from shopfloor.openshop.method import Effort, Progress
from shopfloor.openshop.units import assign_units

ROUNDS = 8  # of rules and improvement, for each goal of a floor on which the exact model moves fast
LONG_FROM = 300  # operations from which it does not: there rounds go on until time is up
NO_END = 2**31
VARIANTS = 20  # rules varied in each round
NEAR = 0.05  # by so much may a schedule pass what is kept and be worth a repair
PASSED = 50.0  # times the share by which it does counts against it
CLOSE, REPAIRS = 8, 3  # such schedules remembered, and repaired in one round
STEPS = 1_000  # changes tried in one cycle of improvement; two to seven cycles a round
FIRST_SHARE = 0.6  # of the time left goes to a goal that another one follows
TELL_EVERY_S = 0.4
NO_HEADS = "No plan was found: some operation needs more heads than its crew has left for long enough."


def floor_plan(
    shop: Shop, goals: tuple[str, ...] = GOALS, effort: Effort | None = None, *, rounds: int | None = None
) -> Outcome:
    """Return the best schedule found for a shop with any rules of the floor; splits are not used.

    Parameters
    ----------
    goals
        What counts first, second, …: ``makespan``, ``tardiness``, ``changeovers``. Nothing of a goal
        already served is given up for the next.
    effort
        Of its bounds only that of the makespan is known here.
    rounds
        How long each goal is improved, where time allows; 0 for list schedules only, None to leave it to
        the number of operations.

    Returns
    -------
    Outcome
        Repeatable where time did not cut it short; without a schedule only if none was found, because
        a crew is too small. The first schedule takes one list rule, near-linear time, and is made even
        if time is up.
    """
    if not len(shop):
        return Outcome(Schedule(*(np.zeros(0, np.int64),) * 3))
    if rounds is None:
        rounds = ROUNDS if len(shop) < LONG_FROM else NO_END
    return _Search(shop, goals, effort or Effort(), rounds).run()


def first_schedule(shop: Shop, goal: str = MAKESPAN, bound_s: int = 0) -> Schedule | None:
    """Return the schedule of the one most promising list rule for a goal."""
    sequencer = Sequencer(Rules.of(shop))
    made = RuleSearch(sequencer, (goal,), Kept(), bound_s, Random(0)).try_next() or rescue(sequencer)
    return None if made is None else schedule_of(shop, made)


def schedule_of(shop: Shop, made: Pass) -> Schedule:
    """Return a pass as a schedule; units that are alike are dealt here."""
    start, end = np.array(made.start, np.int64), np.array(made.end, np.int64)
    own = np.array(made.unit, np.int64)
    unit = np.where(own == NONE, assign_units(shop, start, end), own + 1)
    return Schedule(np.arange(len(start)), start, end, unit=unit)


class _Search:
    """One run: the best schedule, and whether anything was cut short."""

    def __init__(self, shop: Shop, goals: tuple[str, ...], effort: Effort, rounds: int) -> None:
        self.shop, self.effort, self.rounds = shop, effort, rounds
        self.rules = Rules.of(shop)
        self.goals = tuple(goal for goal in goals if has(self.rules, goal)) or (MAKESPAN,)
        self.sequencer = Sequencer(self.rules)
        self.rng = Random(effort.seed)
        self.moves = Moves(self.rules, self.rng)
        self.wanted, self.kept, self.target = self.goals, Kept(), 0
        self.best: Pass | None = None
        self.complete = True
        self.until = 0.0
        self.told = 0.0

    def run(self) -> Outcome:
        """Serve every goal in its turn."""
        for number, goal in enumerate(self.goals):
            share = 1.0 if number == len(self.goals) - 1 else FIRST_SHARE
            self.until = time.monotonic() + share * self.effort.left_s
            self._serve(self.goals[number:])
            if self.best is None:
                return Outcome(None, remarks=(NO_HEADS,), repeatable=self.complete)
            self.kept = self.kept.and_(goal, worth(self.best, goal))
        stopped = "done"
        if not self.complete:
            stopped = "interrupted" if self.effort.stop.is_set() else "time limit"
        assert self.best is not None
        return Outcome(schedule_of(self.shop, self.best), stopped=stopped, repeatable=self.complete)

    def _serve(self, wanted: tuple[str, ...]) -> None:
        self.wanted, self.target = wanted, least(self.rules, wanted[0], self.effort.bound_s)
        deadline = dict(self.kept.values).get(MAKESPAN, self.effort.bound_s)
        search = RuleSearch(self.sequencer, wanted, self.kept, deadline, self.rng)
        close = self._try(search, search.size)
        if self.best is None:
            self.best = rescue(self.sequencer)
        for number in range(self.rounds):
            if self.best is None or self._met() or self._over():
                break
            heat = HEATS[number % len(HEATS)]
            repairs = REPAIRS if self.kept.values else 1
            for made in close[:repairs]:
                self._offer(self._improved(made, heat))
            self._offer(self._improved(self.best, heat))
            self._offer(closed_up(self.sequencer, self.best, wanted, self.kept))
            close = self._promising([*close[repairs:], *self._try(search, VARIANTS)])

    def _met(self) -> bool:
        return self.best is not None and worth(self.best, self.wanted[0]) <= self.target

    def _try(self, search: RuleSearch, runs: int) -> list[Pass]:
        """Try rules; return the most promising schedules of these, some of which may need a repair."""
        found: list[Pass] = []
        for _ in range(runs):
            if self.best is not None and (self._met() or self._over()):
                break
            made = search.try_next()
            if made is not None:
                if not any(self.kept.excess(made)):
                    self._offer(made)
                found = self._promising([*found, made])
        return found

    def _promising(self, made: list[Pass]) -> list[Pass]:
        """Return the few that pass what is kept by nothing or little and are best in the goal, best first."""

        def value(each: Pass) -> float:
            return (1 + worth(each, self.wanted[0])) * (1.0 + PASSED * self.kept.passed_by(each))

        return sorted((each for each in made if self.kept.passed_by(each) <= NEAR), key=value)[:CLOSE]

    def _improved(self, made: Pass, heat: float) -> Pass | None:
        """Return the schedule improved, or None if it does not come to keep what must be kept."""
        assert self.best is not None
        wanted = self.wanted[0]
        for goal, most in self.kept.values:
            if worth(made, goal) > most:
                others = [(name, value) for name, value in self.kept.values if name != goal]
                others.append((wanted, worth(self.best, wanted)))
                beside = Kept(tuple((name, max(value, worth(made, name))) for name, value in others))
                made = self._cycle(made, (goal,), beside, most, heat=0.0)
        if any(self.kept.excess(made)):
            return None
        return self._cycle(made, self.wanted, self.kept, self.target, heat)

    def _cycle(self, made: Pass, wanted: tuple[str, ...], kept: Kept, target: int, heat: float) -> Pass:
        best, ended = improve(
            self.sequencer,
            self.moves,
            made,
            wanted,
            kept,
            target,
            steps=STEPS,
            heat=heat,
            rng=self.rng,
            over=self._over,
        )
        self.complete &= ended
        return best

    def _offer(self, made: Pass | None) -> None:
        if made is not None and (
            self.best is None or score(made, self.wanted) < score(self.best, self.wanted)
        ):
            self.best = made

    def _over(self) -> bool:
        """Whether time for this goal is up; tell now and then how things stand."""
        now = time.monotonic()
        if self.effort.stop.is_set() or now >= self.until:
            self.complete = False
            return True
        if now - self.told >= TELL_EVERY_S:
            self.told = now
            best = None if self.best is None else self.best.makespan
            self.effort.report(Progress("lists", best, self.effort.bound_s, self.effort.left_s))
        return False
