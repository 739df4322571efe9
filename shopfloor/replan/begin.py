"""When the rest of a shift begins: now, or with the next round. Pure.

Where all that is left are rounds of one length and nothing runs across the start of the next one, the rest is
again a shop in unit rounds, and the exact methods hold: they are asked from that round on. Else exactness is
lost, and why is said.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from shopfloor.model.calendar import MINUTE, duration
from shopfloor.replan.current import Current
from shopfloor.replan.outlook import Outlook
from shopfloor.replan.remaining import Left
from shopfloor.replan.told import Told

SLACK_S = 5 * MINUTE  # a round may begin so much later for work that overruns, and never a sixth of it


@dataclass(frozen=True, slots=True)
class Begin:
    """When nothing earlier may start.

    `rounds` is how many rounds lie before, None where the rest does not go on in rounds.
    """

    at_s: int
    rounds: int | None = None
    remarks: tuple[str, ...] = ()


def begin(now: Current, left: Sequence[Left], look: Outlook, told: Told) -> Begin:
    """Return when the rest begins."""
    shop, at_s = now.shop, look.now_s
    say = shop.clock.say
    rows = told.plans[-1].pieces if told.plans else ()
    waiting = [one for one in left if not one.running]
    if not rows or not waiting or any(row.round is None for row in rows):
        return Begin(at_s)
    lengths = {one.seconds for one in waiting}
    if len(lengths) > 1:
        spread = f"{duration(min(lengths))} to {duration(max(lengths))}"
        return _lost(at_s, f"what is left takes {spread}")
    if look.outs:
        return _lost(at_s, f"{shop.machines[look.outs[0].machine].id} is down")
    mark = at_s
    if look.running:
        mark = min(
            (row.start_s for row in rows if row.start_s is not None and row.start_s >= at_s), default=at_s
        )
        last = max(look.running, key=lambda one: (one.ends_s, one.place))
        if last.ends_s > mark + min(SLACK_S, lengths.pop() // 6):
            key = left[last.place].key
            until = f"{key.order} on {key.machine} runs until {say(last.ends_s)}"
            return _lost(at_s, f"{until}, across the start of the next round at {say(mark)}")
        at_s = max(mark, last.ends_s)
    before = [row.round or 0 for row in rows if row.start_s is not None and row.start_s < mark]
    runs = f", when {_operations(len(look.running))} under way will be done" if look.running else ""
    return Begin(at_s, max(before, default=0), (f"The rounds go on from {say(at_s)}{runs}.",))


def _lost(at_s: int, why: str) -> Begin:
    return Begin(at_s, None, (f"The rest no longer goes in rounds, for which the fewest are proved: {why}.",))


def _operations(count: int) -> str:
    return "the operation" if count == 1 else f"the {count} operations"
