"""The rounds of an old plan mended for what is left: the fewest, and most operations where they were."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from shopfloor.model.results import Plan
from shopfloor.model.schedule import NO_ROUND
from shopfloor.openshop.unit_rounds import deal_out
from shopfloor.replan.movement import Place
from shopfloor.rolling.bench import Bench, Timed, Visit
from shopfloor.rolling.recolour import recolour


def mended(bench: Bench, fresh: Plan, rounds: Mapping[int, int]) -> Timed | None:
    """Return the old rounds mended, in as many as a fresh plan has; None where that cannot be.

    Parameters
    ----------
    fresh
        A plan of `bench.rest.fresh` in the fewest rounds.
    rounds
        Operation of `bench.rest.shop` to the round it was to run in, from 1 at begin; new work is left out.
    """
    rest, schedule = bench.rest, fresh.schedule
    if not bench.free_units or not len(schedule) or bool((schedule.round == NO_ROUND).any()):
        return None
    count = int(schedule.round.max())
    times = {
        int(rank): (int(start), int(end))
        for rank, start, end in zip(schedule.round, schedule.start_s, schedule.end_s, strict=True)
    }
    if len(times) < count:
        return None
    operations = rest.from_fresh.tolist()
    job = rest.fresh.operations.job.tolist()
    node, unit = _units(bench, count)
    old = [rounds.get(k, 0) - 1 for k in operations]
    order = sorted(range(len(operations)), key=lambda row: (old[row] < 0, old[row], row))
    colour = recolour(job, node, old, count, order)
    if not _attended(bench, colour):
        return None
    return bench.timed(Visit(k, *times[colour[row] + 1], unit[row]) for row, k in enumerate(operations))


def _units(bench: Bench, most: int) -> tuple[list[int], list[int]]:
    """Return the node, among all units of all machines, and the unit of each operation of `fresh`.

    It keeps the unit it was to have while that has room in so many rounds.
    """
    shop, was = bench.rest.fresh, bench.was
    first = np.r_[0, np.cumsum([machine.count for machine in shop.machines])].tolist()
    if len(shop.machines) == first[-1]:
        return shop.operations.machine.tolist(), [1] * len(shop)
    dealt = deal_out(shop)[1].tolist()
    load: dict[tuple[int, int], int] = {}
    node, unit = [0] * len(shop), [0] * len(shop)
    waiting = []
    for row, (k, machine) in enumerate(
        zip(bench.rest.from_fresh.tolist(), shop.operations.machine.tolist(), strict=True)
    ):
        wanted = was.get(k, Place(0, 0, 0)).unit
        if wanted and load.get((machine, wanted), 0) < most:
            load[machine, wanted] = load.get((machine, wanted), 0) + 1
            unit[row] = wanted
        else:
            waiting.append(row)
    for row in waiting:
        machine = int(shop.operations.machine[row])
        units = range(1, shop.machines[machine].count + 1)
        unit[row] = min(units, key=lambda u: (load.get((machine, u), 0), u != dealt[row], u))
        load[machine, unit[row]] = load.get((machine, unit[row]), 0) + 1
    for row, machine in enumerate(shop.operations.machine.tolist()):
        node[row] = first[machine] + unit[row] - 1
    return node, unit


def _attended(bench: Bench, colour: list[int]) -> bool:
    """Whether no round takes more heads than its crew has."""
    shop = bench.rest.fresh
    for crew in shop.crews:
        theirs = [machine.crew == crew.id for machine in shop.machines]
        taken: dict[int, int] = {}
        for row, machine in enumerate(shop.operations.machine.tolist()):
            if theirs[machine]:
                taken[colour[row]] = taken.get(colour[row], 0) + int(shop.operations.heads[row])
        if max(taken.values(), default=0) > min([crew.heads, *(heads for _, _, heads in crew.levels)]):
            return False
    return True
