"""Changes to a list that may make its schedule better: each begins at what the schedule waited for.

From an operation that ends too late, what each operation waited for last is followed back to the start: its
critical path. Only a change to that path can help (J. Grabowski, E. Nowicki, S. Zdrzalka, E.J.O.R. 26 (1986)
278-285, for blocks of one machine). Where a machine changes over, whole runs of one family move, or an
operation joins another run of its family, since a move that breaks a run costs two changes.
"""

from __future__ import annotations

from dataclasses import dataclass
from random import Random

from shopfloor.openshop.floor.goals import CHANGEOVERS, MAKESPAN
from shopfloor.openshop.floor.rules import NONE, Rules
from shopfloor.openshop.floor.sequence import BY_CREW, Pass

RUNS_SHARE = 0.6  # of the moves, where a critical path meets changeovers, move runs of a family
FAR_MOVE = 30.0  # places that the mean long move spans


@dataclass(frozen=True, slots=True)
class Move:
    """Take the operations of `block`, in their order, to just before or after `anchor`."""

    block: tuple[int, ...]
    anchor: int
    before: bool


class Moves:
    """Proposes changes to the list of one schedule after the other.

    Call :meth:`settle` with a schedule, then :meth:`propose` as often as wanted.
    """

    def __init__(self, rules: Rules, rng: Random) -> None:
        self._rules, self._rng = rules, rng
        self._on_machine: list[list[int]] = [[] for _ in rules.count]  # where there are changeovers
        self._of_crew: list[list[int]] = [[] for _ in rules.crews]
        for operation, machine in enumerate(rules.machine):
            if rules.change[machine] is not None:
                self._on_machine[machine].append(operation)
            if rules.crew[operation] != NONE:
                self._of_crew[rules.crew[operation]].append(operation)
        self._changing = [machine for machine, mine in enumerate(self._on_machine) if len(mine) > 1]
        self._place = [0] * len(rules)

    def settle(self, made: Pass) -> None:
        """Take the schedule that proposals are about; O(n)."""
        self._made = made
        for place, operation in enumerate(made.sequence):
            self._place[operation] = place

    def propose(self, goal: str) -> tuple[list[int], int] | None:
        """Return a changed list and the first place at which it differs, or None if the try came to nothing.

        O(n), most of it to copy the list.
        """
        move = self._at_a_change() if goal == CHANGEOVERS else self._on_critical_path(goal)
        return None if move is None else self._moved(move)

    # ---- where to begin -----------------------------------------------------------------------------

    def _on_critical_path(self, goal: str) -> Move | None:
        path = self._path(self._latest() if goal == MAKESPAN else self._late())
        if not path:
            return None
        rules, rng = self._rules, self._rng
        changes = [
            (before, after)
            for before, after in path
            if rules.machine[before] == rules.machine[after] and self._on_machine[rules.machine[after]]
        ]
        if changes and rng.random() < RUNS_SHARE:
            return self._among_runs(*rng.choice(changes))
        return self._along(path)

    def _latest(self) -> int:
        """Return one of the operations that end last."""
        made = self._made
        jobs = [job for job, done in enumerate(made.done) if done == made.makespan]
        return made.last[self._rng.choice(jobs)]

    def _late(self) -> int:
        """Return the last operation of a late order, drawn by what it adds to the weighted tardiness."""
        made, rules = self._made, self._rules
        left = self._rng.random() * made.late
        found = NONE
        for job, (done, due) in enumerate(zip(made.done, rules.due, strict=True)):
            if done > due and rules.visits[job]:
                found = made.last[job]
                left -= rules.weight[job] * (done - due)
                if left < 0:
                    break
        return found

    def _path(self, operation: int) -> list[tuple[int, int]]:
        """Return pairs of what was waited for and what waited, from an operation back to the start."""
        made, path = self._made, []
        while operation != NONE:
            before = made.cause[operation]
            if before == BY_CREW:
                before = self._at_work_before(operation)
            if before != NONE:
                path.append((before, operation))
            operation = before
        return path

    def _at_work_before(self, operation: int) -> int:
        """Return an operation of the same crew that was at work when this one could at last start."""
        made, start = self._made, self._made.start[operation]
        others = [
            other
            for other in self._of_crew[self._rules.crew[operation]]
            if made.start[other] < start <= made.end[other] and self._place[other] < self._place[operation]
        ]
        return self._rng.choice(others) if others else NONE

    # ---- what to change -----------------------------------------------------------------------------

    def _along(self, path: list[tuple[int, int]]) -> Move:
        """Turn a pair round, or take the later operation far ahead."""
        rng, rules = self._rng, self._rules
        at = rng.randrange(len(path))
        before, after = path[at]
        kind = rng.random()
        if kind < 0.3:
            return Move((after,), before, before=True)
        if kind < 0.5:
            return Move((before,), after, before=False)
        if kind < 0.8:
            alike = rules.machine[before] == rules.machine[after]
            while at + 1 < len(path) and rng.random() < 0.7:
                one, two = path[at + 1]
                if (rules.machine[one] == rules.machine[two]) != alike:
                    break
                at += 1
            return Move((after,), path[at][0], before=True)
        place = self._place[after] - 1 - int(rng.expovariate(1.0 / FAR_MOVE))
        return Move((after,), self._made.sequence[max(0, place)], before=True)

    def _among_runs(self, before: int, after: int) -> Move | None:
        """Move runs of a family, or operations between them, on a unit where one waits for another."""
        rng = self._rng
        line = self._line(after)
        here = line.index(after)
        kind = rng.random()
        if kind < 0.35:
            return self._earlier_run(line, here)
        if kind < 0.65:
            return self._join(line, here)
        if kind < 0.85:
            return self._leave(line, before, here)
        first = _run_start(line, self._rules.family, here)
        return Move((after,), line[rng.randrange(first, here)], before=True) if first < here else None

    def _earlier_run(self, line: list[int], here: int) -> Move | None:
        """Take a run, as far as one operation or whole, before the run before it, or further."""
        rng, family = self._rng, self._rules.family
        first = _run_start(line, family, here)
        if not first:
            return None
        end = here + 1 if rng.random() < 0.5 else _run_end(line, family, here)
        to = _run_start(line, family, first - 1)
        kind = rng.random()
        if kind < 0.3:
            to = rng.randrange(to, first)
        elif kind < 0.5 and to:
            to = _run_start(line, family, to - 1)
        return Move(tuple(line[first:end]), line[to], before=True)

    def _join(self, line: list[int], here: int) -> Move | None:
        """Let an operation, its run as far as it, or all its run join an earlier run of its family."""
        rng, family = self._rng, self._rules.family
        first = _run_start(line, family, here)
        runs = [place for place in range(first) if family[line[place]] == family[line[here]]]
        if not runs:
            return None
        place = runs[-1] if rng.random() < 0.7 else rng.choice(runs)
        return Move(self._part(line, here), line[place], before=False)

    def _leave(self, line: list[int], before: int, here: int) -> Move | None:
        """Let what is waited for, alone or with its run, join a later run of its family."""
        rng, family = self._rng, self._rules.family
        later = [place for place in range(here + 1, len(line)) if family[line[place]] == family[before]]
        if not later or before not in line:
            return None
        place = later[0] if rng.random() < 0.7 else rng.choice(later)
        return Move(self._part(line, line.index(before)), line[place], before=rng.random() < 0.5)

    def _part(self, line: list[int], here: int) -> tuple[int, ...]:
        """Return an operation, its run as far as it, or all its run."""
        kind, family = self._rng.random(), self._rules.family
        if kind < 0.5:
            return (line[here],)
        end = here + 1 if kind < 0.7 else _run_end(line, family, here)
        return tuple(line[_run_start(line, family, here) : end])

    def _at_a_change(self) -> Move | None:
        """Move what stands at some change of family."""
        if not self._changing:
            return None
        rng, family = self._rng, self._rules.family
        line = self._line(rng.choice(self._on_machine[rng.choice(self._changing)]))
        turns = [place for place in range(1, len(line)) if family[line[place]] != family[line[place - 1]]]
        if not turns:
            return None
        here = rng.choice(turns)
        return self._among_runs(line[here - 1], line[rng.randrange(here, _run_end(line, family, here))])

    def _line(self, operation: int) -> list[int]:
        """Return what runs on the unit of an operation, in order of time."""
        made = self._made
        unit, start = made.unit[operation], made.start
        mine = [k for k in self._on_machine[self._rules.machine[operation]] if made.unit[k] == unit]
        return sorted(mine, key=start.__getitem__)

    # ---- the list -----------------------------------------------------------------------------------

    def _moved(self, move: Move) -> tuple[list[int], int] | None:
        """Return the list after a move, unless it would put a higher step of an order before a lower one."""
        place, sequence = self._place, self._made.sequence
        block, taken = move.block, set(move.block)
        if move.anchor in taken:
            return None
        places = [place[move.anchor], *[place[operation] for operation in block]]
        low, high = min(places), max(places) + 1
        between = [operation for operation in sequence[low:high] if operation not in taken]
        at = between.index(move.anchor) + (not move.before)
        between[at:at] = block
        if self._steps_kept(between, block):
            return [*sequence[:low], *between, *sequence[high:]], low
        return None

    def _steps_kept(self, between: list[int], block: tuple[int, ...]) -> bool:
        step, job = self._rules.step, self._rules.job
        reached = {job[operation]: NONE for operation in block if step[operation] != NONE}
        if reached:
            for operation in between:
                rank = step[operation]
                if rank != NONE and job[operation] in reached:
                    if rank < reached[job[operation]]:
                        return False
                    reached[job[operation]] = rank
        return True


def _run_start(line: list[int], family: list[int], here: int) -> int:
    """Return where the run of one family that reaches place `here` begins."""
    while here and family[line[here - 1]] == family[line[here]]:
        here -= 1
    return here


def _run_end(line: list[int], family: list[int], here: int) -> int:
    """Return the place after the run of one family that reaches place `here`."""
    end = here + 1
    while end < len(line) and family[line[end]] == family[line[here]]:
        end += 1
    return end
