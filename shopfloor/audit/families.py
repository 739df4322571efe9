"""How much changeover time a machine's families force, whatever the sequence: as a witness claims it.

A sequence through a set of families pays at least its cheapest path, since no way round is shorter. For
one unit and few families that is found exactly (M. Held, R. M. Karp, J. SIAM 10 (1962) 196-210); else
every family that no unit need begin with is entered at least once, at its cheapest entrance.
"""

from __future__ import annotations

from collections.abc import Sequence

from shopfloor.model.shop import Changeovers

MOST_EXACT = 10  # families; 2^n · n² steps


def forced_changeover(rule: Changeovers, families: Sequence[str], units: int, start: str | None) -> int:
    """Return seconds of changeover that no sequence of `families` over `units` units can avoid.

    Parameters
    ----------
    families
        Each once. What some of them force, all of them do, so the first few are looked at alone as well.
    start
        The family in which every unit begins; None where it may begin in any.
    """
    best = 0
    for size in range(len(families), 0, -1):
        known = start if size == len(families) else None
        best = max(best, _least(rule, families[:size], units, known))
    return best


def _least(rule: Changeovers, families: Sequence[str], units: int, start: str | None) -> int:
    if units == 1 and len(families) <= MOST_EXACT:
        return _cheapest_path(rule, families, start)
    sources = {*families, start} if start is not None else set(families)
    entrances = sorted(
        min((rule.seconds(source, family) for source in sources if source != family), default=0)
        for family in families
        if family != start
    )
    free = units if start is None else 0
    return sum(entrances[: max(0, len(entrances) - free)])


def _cheapest_path(rule: Changeovers, families: Sequence[str], start: str | None) -> int:
    """Return the cost of the cheapest path through all families, by the set of those behind and the last."""
    reach: dict[tuple[frozenset[int], int], int] = {
        (frozenset({k}), k): 0 if start is None else rule.seconds(start, family)
        for k, family in enumerate(families)
    }
    for _ in range(len(families) - 1):
        longer: dict[tuple[frozenset[int], int], int] = {}
        for (behind, last), cost in reach.items():
            for after in range(len(families)):
                if after not in behind:
                    key = (behind | {after}, after)
                    total = cost + rule.seconds(families[last], families[after])
                    longer[key] = min(longer.get(key, total), total)
        reach = longer
    return min(reach.values(), default=0)
