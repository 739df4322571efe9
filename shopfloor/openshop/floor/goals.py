"""What a schedule of a floor is judged by: one goal after the other, in whole numbers, less is better."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from shopfloor.openshop.floor.rules import FAR, Rules
from shopfloor.openshop.floor.sequence import Limits, Pass
from shopfloor.openshop.incumbent import MAKESPAN as MAKESPAN
from shopfloor.openshop.incumbent import TARDINESS as TARDINESS

CHANGEOVERS = "changeovers"
FLOOR_GOALS = (MAKESPAN, TARDINESS, CHANGEOVERS)


def worth(made: Pass, goal: str) -> int:
    """Return what a schedule has of a goal: seconds; thousandths of priority × seconds for tardiness."""
    if goal == MAKESPAN:
        return made.makespan
    return made.late if goal == TARDINESS else made.changed


def score(made: Pass, wanted: Sequence[str]) -> tuple[int, ...]:
    """Return what a schedule has of one goal after the other; compared as tuples."""
    return tuple(worth(made, goal) for goal in wanted)


@dataclass(frozen=True, slots=True)
class Kept:
    """What goals already served came to, as pairs of goal and value: no more of them is allowed."""

    values: tuple[tuple[str, int], ...] = ()

    def and_(self, goal: str, most: int) -> Kept:
        """Return these and one more."""
        return Kept((*self.values, (goal, most)))

    def excess(self, made: Pass) -> tuple[int, ...]:
        """Return by how much a schedule passes each; all zero where it may count."""
        return tuple(max(0, worth(made, goal) - most) for goal, most in self.values)

    def passed_by(self, made: Pass) -> float:
        """Return by what share of it a schedule passes the one that it passes most; 0 if none."""
        shares = [(worth(made, goal) - most) / max(most, 1) for goal, most in self.values]
        return max([0.0, *shares])

    def limits(self, goal: str, most: int) -> Limits:
        """Return them as limits of a pass, together with `most` of the goal being served."""
        latest = late = changed = FAR
        for name, value in (*self.values, (goal, most)):
            if name == MAKESPAN:
                latest = min(latest, value)
            elif name == TARDINESS:
                late = min(late, value)
            else:
                changed = min(changed, value)
        return Limits(latest, late, changed)


def least(rules: Rules, goal: str, bound_s: int) -> int:
    """Return what every schedule has of a goal: of makespan `bound_s`; as late as if no order ever waited."""
    if goal == MAKESPAN:
        return bound_s
    if goal == CHANGEOVERS:
        return 0
    work = [0] * len(rules.release)
    for job, seconds in zip(rules.job, rules.seconds, strict=True):
        work[job] += seconds
    return sum(
        weight * max(0, release + needs - due)
        for weight, release, needs, due in zip(rules.weight, rules.release, work, rules.due, strict=True)
        if needs
    )


def has(rules: Rules, goal: str) -> bool:
    """Whether schedules of this floor can differ in a goal at all."""
    if goal == TARDINESS:
        return any(due < FAR for due in rules.due)
    return goal == MAKESPAN or any(change is not None for change in rules.change)
