"""Improvement of one schedule for one goal, always legal, anytime: changes to its list, kept or dropped.

Worse schedules are accepted for a while, with a likelihood that falls with what they lose and in the course
of a cycle (S. Kirkpatrick, C. D. Gelatt, M. P. Vecchi, Science 220 (1983) 671-680); each cycle begins at the
best. The threshold is drawn first, so that a pass over a list is broken off as soon as it has lost more.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from random import Random

from shopfloor.openshop.floor.goals import Kept, score, worth
from shopfloor.openshop.floor.list_rule import in_order
from shopfloor.openshop.floor.moves import Moves
from shopfloor.openshop.floor.sequence import Pass, Sequencer
from shopfloor.openshop.floor.timetable import serial

HEATS = (0.002, 0.01, 0.0)  # cycle by cycle: the mean loss accepted at first, as a share of the best value


def improve(
    sequencer: Sequencer,
    moves: Moves,
    made: Pass,
    wanted: Sequence[str],
    kept: Kept,
    target: int,
    *,
    steps: int,
    heat: float,
    rng: Random,
    over: Callable[[], bool] = lambda: False,
) -> tuple[Pass, bool]:
    """Run one cycle: return the best schedule found, and whether the cycle came to its end or met the target.

    Parameters
    ----------
    made
        A schedule that keeps to `kept`; every schedule accepted does.
    wanted
        The goal, and what counts among schedules that have the same of it.
    target
        As little of the goal as there can be.
    steps
        Changes tried; each costs a pass over what comes after it in the list, often broken off early.
    heat
        The mean loss accepted at first, as a share of the value.
    """
    goal = wanted[0]
    best, value = made, worth(made, goal)
    now = value
    moves.settle(made)
    for step in range(steps):
        if value <= target:
            break
        if over():
            return best, False
        change = moves.propose(goal)
        if change is None:
            continue
        loss = heat * value * (1.0 - step / steps)
        most = now + int(loss * rng.expovariate(1.0)) if loss else now
        sequence, begin = change
        trial = sequencer.again(made, sequence, begin, kept.limits(goal, most))
        if trial is not None:
            made, now = trial, worth(trial, goal)
            moves.settle(made)
            if now < value or (now == value and score(made, wanted) < score(best, wanted)):
                best, value = made, now
    return best, True


def closed_up(sequencer: Sequencer, made: Pass, wanted: Sequence[str], kept: Kept) -> Pass:
    """Return the schedule with every operation put as early as gaps allow, if that is no worse."""
    table = serial(sequencer.rules, in_order(made.start), made.unit)
    if table is None:
        return made
    again = sequencer.whole(in_order([spot.start for spot in table.spots if spot is not None]))
    if again is None or any(kept.excess(again)) or score(again, wanted) >= score(made, wanted):
        return made
    return again
