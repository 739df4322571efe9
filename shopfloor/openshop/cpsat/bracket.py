"""Small shops, makespan: provers raise the lower bound, finders lower the makespan, until they meet.

Each worker is a thread with a single-threaded solver of its own; all share bound and best schedule, and
a question whose answer another worker has just made pointless is broken off. A prover asks whether a
schedule as short as the bound exists, then bisects, then asks for one less than the best, in growing
slices with another sequence of variables and another form of the model each time: that diversifies
far better than another seed. A finder minimises from the best schedule, then asks for one less.

Slices are cut by the solver's own count of its work, not by the clock. With one worker all questions
are asked in a fixed order, so that the answer repeats if the time limit does not cut it off.
"""

from __future__ import annotations

import threading
from collections import Counter
from collections.abc import Callable, Iterator
from functools import partial
from itertools import count

import numpy as np
from ortools.sat.python import cp_model

from shopfloor.model.shop import Shop
from shopfloor.openshop.cpsat.constraints import add_rules, one_at_a_time
from shopfloor.openshop.cpsat.extract import starts_of
from shopfloor.openshop.cpsat.objective import makespan
from shopfloor.openshop.cpsat.pairs import cut_starts, mirrored, order_pairs, reversible
from shopfloor.openshop.cpsat.solve import ROOM_S, Answer, Switchboard, threads, watch
from shopfloor.openshop.cpsat.variables import Grid, declare
from shopfloor.openshop.incumbent import MAKESPAN, Incumbent
from shopfloor.openshop.left_shift import left_shift
from shopfloor.openshop.method import Effort, Progress

# The solver's own units of work, about two seconds each.
ATTEMPT_WORK, FIRST_WORK, SLICE_WORK, FIND_WORK, NO_LIMIT = 0.3, 0.8, 1.0, 2.0, 1e9
LONG_LINE = 9  # from this many operations on a line, no-overlap pays beside the pairs
MOST_WORKERS = 8
STAGE = "closing in on the least makespan"
ENDED = object()


class Bracket:
    """The search for the least makespan between a lower bound and the best schedule.

    Parameters
    ----------
    incumbent
        Holds a schedule already.
    bound_s
        The best lower bound known.

    Attributes
    ----------
    bound_s
        The best lower bound proved, on the grid.
    repeatable
        Whether all that was found would be found again: no clock and no race had a say.
    """

    def __init__(self, shop: Shop, incumbent: Incumbent, bound_s: int, effort: Effort) -> None:
        self.shop, self.incumbent, self.effort = shop, incumbent, effort
        self.repeatable = True
        self._grid = Grid.of(shop)
        self._unit = self._grid.unit_s
        self.bound_s = self._grid.up(bound_s) * self._unit
        self._board = Switchboard()
        self._lock = threading.Lock()
        self._long_lines = longest_line(shop) >= LONG_LINE
        self._reversible = reversible(shop)

    def run(self, until: float | None = None) -> None:
        """Search until bound and makespan meet, or until the effort or the moment `until` is over."""
        workers = min(threads(self.effort.workers), MOST_WORKERS)
        if workers == 1:
            turns = _in_turn(self._prover(0, 1), self._finder(0, FIND_WORK))
            self.repeatable = self._watch([turns], until)
            return
        if not self._watch([self._attempt()], until) or self.closed:
            self.repeatable = self.closed
            return
        self.repeatable = False
        provers = (workers + 1) // 2
        tasks = [self._prover(number, provers) for number in range(provers)]
        tasks += [self._finder(number, None) for number in range(workers - provers)]
        self._watch(tasks, until)

    @property
    def closed(self) -> bool:
        """Whether bound and makespan have met."""
        return self.bound_s >= self._best_s

    @property
    def _best_s(self) -> int:
        return self.incumbent.value(MAKESPAN)

    @property
    def _done(self) -> bool:
        return self.closed or self.effort.over or self._board.is_off

    def _watch(self, tasks: list[Iterator[None]], until: float | None) -> bool:
        def progress() -> Progress:
            return Progress(STAGE, self._best_s, self.bound_s, self.effort.left_s)

        runs = [partial(_exhaust, task) for task in tasks]
        return watch(runs, self._board, self.effort, progress, until=until)

    # ---- questions in turn ---------------------------------------------------------------------

    def _attempt(self) -> Iterator[None]:
        """One thread for a short while, which is enough for many a small shop, and repeats."""
        self._ask(self._best_s - self._unit, ATTEMPT_WORK, minimise=True)
        yield

    def _prover(self, number: int, of: int) -> Iterator[None]:
        """Raise the bound; `of` provers cut the span between bound and best in different places."""
        if number == 0 and not self._done:
            self._ask(self.bound_s, FIRST_WORK)
            yield
        in_vain = self.bound_s  # the longest length asked without an answer
        slices: Counter[int] = Counter()
        for turn in count(1):
            if self._done:
                return
            low, high = max(self.bound_s, in_vain + self._unit), self._best_s - self._unit
            chance = (self.effort.seed, number, turn)
            if low < high:
                middle = low + (high - low) * (number + 1) // (of + 1) // self._unit * self._unit
                if self._ask(middle, FIRST_WORK, chance=chance) is Answer.UNKNOWN:
                    in_vain = max(in_vain, middle)
            else:
                work = SLICE_WORK * 2.0 ** slices[high]  # a proof may take long: what is cut off is lost
                slices[high] += 1
                form = self._long_lines is (slices[high] % 2 == 1)
                self._ask(high, work, chance=chance, no_overlap=form)
            yield

    def _finder(self, number: int, work: float | None) -> Iterator[None]:
        """Lower the makespan; with `work` in growing slices, else each question to its end."""
        if number == 0 and not self._done:
            self._ask(self._best_s - self._unit, FIND_WORK, minimise=True)
            yield
        for turn in count(1):
            if self._done:
                return
            chance = (self.effort.seed, -1 - number, turn)
            allowed = NO_LIMIT if work is None else work * 2.0**turn
            self._ask(self._best_s - self._unit, allowed, chance=chance, no_overlap=True)
            yield

    def _ask(
        self,
        latest_s: int,
        work: float,
        *,
        minimise: bool = False,
        no_overlap: bool | None = None,
        chance: tuple[int, ...] | None = None,
    ) -> Answer:
        """Ask for a schedule that ends by `latest_s`, the shortest such if `minimise`; share the answer."""
        sequence = None
        if chance is not None:
            sequence = np.random.default_rng([abs(part) * 2 + (part < 0) for part in chance]).permutation(
                len(self.shop)
            )
        model = declare(self.shop, latest_s, rows=sequence)
        wanted = self._long_lines if no_overlap is None else no_overlap
        add_rules(model, without=() if wanted else (one_at_a_time,))
        fixed = order_pairs(model, mirror=self._reversible)
        if minimise:
            model.cp.minimize(makespan(model, self.bound_s).expression)
        else:
            cut_starts(model)
        start = self.incumbent.start
        if start is not None:
            turned = fixed is not None and start[fixed[0]] > start[fixed[1]]
            model.hint(mirrored(self.shop, start) if turned else start)

        def keep(value: Callable[[cp_model.IntVar], int]) -> None:
            if self.incumbent.offer(left_shift(self.shop, starts_of(model, value))):
                self._board.stop_pointless()

        def pointless() -> bool:
            return self.closed or (not minimise and not self.bound_s <= latest_s < self._best_s)

        solver = cp_model.CpSolver()
        _set(solver, self.effort, work)
        found = self._board.solve(model.cp, solver, keep, pointless)
        if found.answer is Answer.NONE:
            self._raise_bound(latest_s + self._unit)
        elif minimise and found.answer is not Answer.UNKNOWN:
            self._raise_bound(found.bound * self._unit)
        return found.answer

    def _raise_bound(self, bound_s: int) -> None:
        with self._lock:
            self.bound_s = max(self.bound_s, bound_s)
        self._board.stop_pointless()


def longest_line(shop: Shop) -> int:
    """Return the most operations that share an order or a machine of one unit."""
    single = np.array([machine.count == 1 for machine in shop.machines], bool)
    on_machine = np.bincount(shop.operations.machine, minlength=len(shop.machines))[single]
    return int(max(np.bincount(shop.operations.job).max(initial=0), on_machine.max(initial=0)))


def _set(solver: cp_model.CpSolver, effort: Effort, work: float) -> None:
    """Set what the pairs model runs best with: one thread, clause learning and little else."""
    chosen = solver.parameters
    chosen.num_workers = 1
    chosen.linearization_level = 0
    chosen.symmetry_level = 0
    chosen.use_sat_inprocessing = False
    chosen.new_linear_propagation = False
    chosen.random_seed = effort.seed % 2**31
    chosen.max_deterministic_time = work
    chosen.max_time_in_seconds = max(effort.left_s, ROOM_S)
    chosen.catch_sigint_signal = False


def _exhaust(questions: Iterator[None]) -> None:
    for _ in questions:
        pass


def _in_turn(*tasks: Iterator[None]) -> Iterator[None]:
    """Take one question of each task after the other, until all have ended."""
    left = list(tasks)
    while left:
        left = [task for task in left if next(task, ENDED) is not ENDED]
        yield
