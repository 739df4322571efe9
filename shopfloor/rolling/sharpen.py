"""A timetable near the old plan, improved: it may end where planning from scratch does not get to."""

from __future__ import annotations

from collections.abc import Callable
from random import Random

from shopfloor.openshop.floor.goals import Kept, has, least, worth
from shopfloor.openshop.floor.improve import HEATS, improve
from shopfloor.openshop.floor.moves import Moves
from shopfloor.openshop.floor.rules import Rules
from shopfloor.openshop.floor.sequence import Sequencer
from shopfloor.rolling.bench import Bench, Timed

STEPS = 1_000  # changes tried in a cycle, three cycles a goal


def sharpened(
    bench: Bench, timed: Timed, bound_s: int, over: Callable[[], bool], *, seed: int = 0, steps: int = STEPS
) -> tuple[Timed | None, bool]:
    """Improve the sequence of a timetable, goal after goal, by the local search that fresh plans take.

    Parameters
    ----------
    timed
        Where to begin; its sequence counts, not its times.
    bound_s
        A lower bound of the makespan of `bench.rest.fresh`.
    over
        Asked between steps; true ends the search.

    Returns
    -------
    The timetable of the improved sequence, None if it has none; and whether the search came to its end.
    """
    rest = bench.rest
    rules, rng, ended = Rules.of(rest.fresh), Random(seed), True
    loose = rest.from_fresh.tolist()
    rows = sorted(range(len(loose)), key=lambda row: (timed.places[loose[row]].start_s, row))
    sequencer, moves, kept = Sequencer(rules), Moves(rules, rng), Kept()
    made = sequencer.whole(rows) if rows else None
    if made is None:
        return None, True
    for number, goal in enumerate(bench.goals):
        if not has(rules, goal):
            continue
        for heat in HEATS:
            made, through = improve(
                sequencer,
                moves,
                made,
                bench.goals[number:],
                kept,
                least(rules, goal, bound_s),
                steps=steps,
                heat=heat,
                rng=rng,
                over=over,
            )
            ended &= through
        kept = kept.and_(goal, worth(made, goal))
    start = made.start
    sequence = [loose[row] for row in sorted(rows, key=lambda row: (start[row], row))]
    unit = {loose[row]: place + 1 for row, place in enumerate(made.unit) if place >= 0}
    return bench.time((k for k in sequence if k not in rest.pinned), unit), ended
