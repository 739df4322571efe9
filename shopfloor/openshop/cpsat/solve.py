"""Running the solver: its statuses in our words, its threads watched, stopped at once when asked."""

from __future__ import annotations

import enum
import math
import os
import threading
import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass

from ortools.sat.python import cp_model

from shopfloor.openshop.method import Effort, Progress

REPORT_EVERY_S = 0.4
LOOK_EVERY_S = 0.05
ROOM_S = 0.02  # less search time than this is none


class Answer(enum.Enum):
    """What the solver found out."""

    PROVED = "a solution, and none is better"
    FOUND = "a solution; whether a better one exists is not known"
    NONE = "no solution exists"
    UNKNOWN = "nothing found, nothing proved"


ANSWERS = {
    cp_model.OPTIMAL: Answer.PROVED,
    cp_model.FEASIBLE: Answer.FOUND,
    cp_model.INFEASIBLE: Answer.NONE,
    cp_model.UNKNOWN: Answer.UNKNOWN,
}  # MODEL_INVALID is a bug of ours and raises KeyError


def threads(workers: int) -> int:
    """Return how many solver threads to run; 0 takes one for each core this process may use."""
    if workers:
        return workers
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


@dataclass(frozen=True, slots=True)
class Found:
    """The answer, and the least value of the objective that the solver could not exclude."""

    answer: Answer
    bound: int = 0


class Switchboard:
    """The solvers that run now, so that any thread may stop one or all of them."""

    def __init__(self) -> None:
        self._lock = threading.Lock()
        self._running: dict[int, tuple[cp_model.CpSolver, Callable[[], bool]]] = {}
        self._next = 0
        self._off = False

    @property
    def is_off(self) -> bool:
        """Whether nothing starts here any more."""
        return self._off

    def off(self) -> None:
        """Stop everything, and let nothing start again. May be called again and again."""
        with self._lock:
            self._off = True
        self.stop_pointless()

    def stop_pointless(self) -> None:
        """Stop the solvers whose question has become pointless."""
        with self._lock:
            for solver, pointless in self._running.values():
                if self._off or pointless():
                    solver.stop_search()

    def solve(
        self,
        cp: cp_model.CpModel,
        solver: cp_model.CpSolver,
        on_solution: Callable[[Callable[[cp_model.IntVar], int]], None],
        pointless: Callable[[], bool] = lambda: False,
    ) -> Found:
        """Run one solver to its end, in this thread.

        Parameters
        ----------
        on_solution
            Called with a function from variable to value, once for each better solution.
        pointless
            Whether the answer no longer matters; asked by :meth:`stop_pointless`, from any thread.
        """
        with self._lock:
            if self._off or pointless():
                return Found(Answer.UNKNOWN)
            key, self._next = self._next, self._next + 1
            self._running[key] = (solver, pointless)
        try:
            status = solver.solve(cp, _Listener(on_solution))
        finally:
            with self._lock:
                del self._running[key]
        answer = ANSWERS[status]
        known = answer in (Answer.PROVED, Answer.FOUND) or not cp.has_objective()
        bound = math.ceil(solver.best_objective_bound - 1e-6) if cp.has_objective() and known else 0
        return Found(answer, bound)


class _Listener(cp_model.CpSolverSolutionCallback):
    def __init__(self, tell: Callable[[Callable[[cp_model.IntVar], int]], None]) -> None:
        super().__init__()
        self._tell = tell

    def on_solution_callback(self) -> None:
        self._tell(self.value)


def watch(
    tasks: Sequence[Callable[[], None]],
    board: Switchboard,
    effort: Effort,
    progress: Callable[[], Progress],
    *,
    until: float | None = None,
) -> bool:
    """Run `tasks` in threads of their own until all have ended; report, and stop them in time.

    The calling thread stays in Python, so that Ctrl-C reaches it at once.

    Parameters
    ----------
    progress
        Makes what is reported, about twice a second.
    until
        Stop at this moment of ``time.monotonic()``, even if the effort's own limit is later.

    Returns
    -------
    Whether the tasks ended by themselves, before any limit and unasked.

    Raises
    ------
    Exception
        Whatever a task raised.
    """
    errors: list[BaseException] = []

    def guarded(task: Callable[[], None]) -> None:
        try:
            task()
        except BaseException as error:
            errors.append(error)
            board.off()

    crew = [threading.Thread(target=guarded, args=(task,), daemon=True) for task in tasks]
    for thread in crew:
        thread.start()
    own_end, told = True, time.monotonic()
    while any(thread.is_alive() for thread in crew):
        if effort.over or (until is not None and time.monotonic() >= until):
            own_end = False
            board.off()
        next(thread for thread in crew if thread.is_alive() or thread is crew[-1]).join(LOOK_EVERY_S)
        if time.monotonic() - told >= REPORT_EVERY_S:
            told = time.monotonic()
            effort.report(progress())
    if errors:
        raise errors[0]
    return own_end and not effort.over  # a solver keeps the time limit too, and may have been first
