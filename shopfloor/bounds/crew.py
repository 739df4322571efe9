"""Crew bounds: so many heads can attend only so much work at once."""

from __future__ import annotations

import numpy as np

from shopfloor.model.calendar import duration
from shopfloor.model.results import Bound
from shopfloor.model.shop import Crew, Ints, Shop


def crew_bounds(shop: Shop) -> list[Bound]:
    """Return a bound for each crew with work: head-seconds over heads, in whole rounds where times are equal.

    The first attended operation starts no earlier than the least head among them (release and lower
    steps); with equal times p and h heads each, at most ⌊heads/h⌋ run in any one round, and an operation
    that overlaps no round boundary of the others costs a whole round's worth of heads.
    """
    bounds = []
    for crew in shop.crews:
        theirs = np.array([machine.crew == crew.id for machine in shop.machines], bool)
        attended = np.flatnonzero(theirs[shop.operations.machine])
        if len(attended) and crew.heads and not crew.levels:
            bounds.append(_crew_bound(shop, crew, attended))
    return bounds


def _crew_bound(shop: Shop, crew: Crew, attended: Ints) -> Bound:
    only_setup = np.array([machine.set_up_only for machine in shop.machines], bool)[shop.operations.machine]
    seconds = np.where(only_setup, shop.operations.setup_s, shop.operations.seconds)[attended]
    heads = shop.operations.heads[attended]
    release = int(shop.head_s[attended].min())
    stays = not only_setup[attended].any()
    equal = stays and int(seconds.min()) == int(seconds.max()) and int(heads.min()) == int(heads.max())
    if equal and heads[0] > 0 and not shop.has_splits and not _lends_heads(shop, attended):
        length, at_once = int(seconds[0]), max(1, crew.heads // int(heads[0]))
        rounds = -(-len(attended) // at_once)
        value = shop.work_clock.finish(release, rounds * length)
        return Bound(
            kind="crew rounds",
            value_s=value,
            witness={
                "crew": crew.id,
                "from_s": release,
                "operations": len(attended),
                "at_once": at_once,
                "round_s": length,
            },
            sentence=f"Crew {crew.id} can attend {at_once} of its {len(attended)} operations at once, "
            f"each {duration(length)}, so nothing can end before {shop.clock.say(value)}.",
        )
    work = int((seconds * heads).sum())
    value = shop.work_clock.finish(release, -(-work // crew.heads))
    return Bound(
        kind="crew",
        value_s=value,
        witness={"crew": crew.id, "from_s": release, "head_seconds": work},
        sentence=f"The {crew.heads} heads of crew {crew.id} have {duration(work)} of one head's work, "
        f"so nothing can end before {shop.clock.say(value)}.",
    )


def _lends_heads(shop: Shop, attended: Ints) -> bool:
    """Whether work may pause on one machine while the crew goes on elsewhere: then rounds do not count.

    Two heads can share three operations of two seconds in three seconds, if one of them pauses for a
    second. A break of the whole hall is no such time: nobody works then.
    """
    machines = [shop.machines[machine] for machine in np.unique(shop.operations.machine[attended]).tolist()]
    return any(machine.pauses and machine.closed for machine in machines)
