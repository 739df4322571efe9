"""How many people there are from a moment on, and how many of them running work holds. Pure.

A crew's heads over time are steps: (moment, heads), in order of time, the last one for good.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from itertools import pairwise

from shopfloor.model.shop import Crew, Shop
from shopfloor.replan.told import Told

Steps = list[tuple[int, int]]
Held = tuple[int, int, int]  # from, to, heads


def present(shop: Shop, told: Told, now_s: int) -> tuple[tuple[Crew, ...], tuple[str, ...]]:
    """Return the crews with as many people as are said to be there, from now on, and what was assumed.

    What was said of the hall without naming a crew is meant for its only crew.
    """
    crews, remarks = [], []
    for crew in shop.crews:
        said = told.crew.get(crew.id, told.crew.get("") if len(shop.crews) == 1 else None)
        if said is None or said[1] == heads_at(crew, said[0]):
            crews.append(crew)
            continue
        at_s, heads = said
        planned = heads_at(crew, at_s)

        def there(level: int, planned: int = planned, heads: int = heads) -> int:
            return heads if level == planned else min(level, heads)

        end = shop.shift_end_s
        until = end if end is not None and end > now_s else None
        ahead = steps(crew, now_s)
        today = [(moment, there(level)) for moment, level in ahead if until is None or moment < until]
        later = []
        if until is not None:  # the next shift has the people it was planned to have
            later = [(until, heads_at(crew, until)), *((at, level) for at, level in ahead if at > until)]
        crews.append(crew_of(crew.id, [*today, *later]))
        remarks.append(
            f"Crew {crew.id} has {heads} there since {shop.clock.say(at_s)} and not {planned}; it is taken "
            f"to stay so{'' if until is None else ' until the shift ends'}, and never to have more than were "
            "planned."
        )
    if "" in told.crew and len(shop.crews) > 1:
        remarks.append(
            "How many people are there was said without naming one of the crews; it counts for none."
        )
    return tuple(crews), tuple(remarks)


def heads_at(crew: Crew, moment: int) -> int:
    """Return how many heads a crew has at a moment."""
    return next((heads for start, end, heads in crew.levels if start <= moment < end), crew.heads)


def steps(crew: Crew, from_s: int) -> Steps:
    """Return a crew's heads from a moment on."""
    turns = {from_s, *(turn for level in crew.levels for turn in level[:2] if turn > from_s)}
    return _joined((turn, heads_at(crew, turn)) for turn in sorted(turns))


def crew_of(name: str, heads: Iterable[tuple[int, int]], from_s: int = 0) -> Crew:
    """Return the crew of steps, its times counted from `from_s`."""
    found = _joined(heads)
    levels = tuple(
        (start - from_s, end - from_s, level)
        for (start, level), (end, _) in pairwise(found)
        if level != found[-1][1]
    )
    return Crew(name, found[-1][1], levels)


def crew_from(name: str, heads: Steps, begin_s: int) -> Crew:
    """Return the crew of steps on a clock that starts at `begin_s`."""
    first = [level for moment, level in heads if moment <= begin_s][-1]
    later = [(moment, level) for moment, level in heads if moment > begin_s]
    return crew_of(name, [(begin_s, first), *later], begin_s)


def _joined(heads: Iterable[tuple[int, int]]) -> Steps:
    found: Steps = []
    for moment, level in heads:
        if not found or found[-1][1] != level:
            found.append((moment, level))
    return found


def change(heads: Steps, held: Sequence[Held], how: Callable[[int, int], int]) -> Steps:
    """Return the steps with `how(level, held)` for the level of each moment and the heads held then."""
    first = heads[0][0]
    turns = {turn for turn, _ in heads} | {
        turn for start, end, _ in held for turn in (max(start, first), end) if turn > first
    }
    found = []
    for turn in sorted(turns):
        level = [heads for moment, heads in heads if moment <= turn][-1]
        taken = sum(count for start, end, count in held if start <= turn < end)
        found.append((turn, how(level, taken)))
    return _joined(found)
