"""What carries over, as the shop of the next shift: the same hall, only what is left. Pure."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from shopfloor.model.calendar import duration
from shopfloor.model.shop import NO_DUE, Operations, Orders, Shop
from shopfloor.replan.current import Current
from shopfloor.replan.remaining import Left
from shopfloor.settings import MAX_CELL_CHARACTERS


def carry_shop(now: Current, left: Sequence[Left], at_s: int) -> Shop:
    """Return the shop of what is left at `at_s`, each operation with its remaining time and what befell it.

    Times stay on the wall clock where there is one. On a clock that starts at zero they count from `at_s`
    on; there is no time before zero, so an order due earlier is due at once, and its note says by how much.
    """
    shop = now.shop
    columns, orders = shop.operations, shop.orders
    index = np.array([one.operation for one in left], np.int64)
    used, job = np.unique(columns.job[index], return_inverse=True)
    notes = {
        place: text
        for place, one in enumerate(left)
        if (text := _note(shop, one, columns.notes.get(one.operation, ""), at_s))
    }
    release, due = orders.release_s[used], orders.due_s[used]
    if not shop.clock.running:
        release = np.maximum(release - at_s, 0)
        due = np.where(due == NO_DUE, NO_DUE, np.maximum(due - at_s, 0))
    return replace(
        shop,
        orders=Orders(
            tuple(orders.ids[place] for place in used.tolist()), release, due, orders.priority[used]
        ),
        operations=Operations(
            job,
            columns.machine[index],
            np.array([max(one.seconds, one.setup_s + 1) for one in left], np.int64),
            columns.step[index],
            columns.splittable[index],
            columns.heads[index],
            columns.family[index],
            np.array([one.setup_s for one in left], np.int64),
            columns.row[index],
            notes,
        ),
        breaks=(),
        shift_end_s=None,
        unit_rounds=False,
    )


def _note(shop: Shop, one: Left, note: str, at_s: int) -> str:
    parts = [note] if note else []
    if one.running and one.since_s is not None:
        parts.append(f"under way since {shop.clock.say(one.since_s)}")
    elif one.repeats:
        parts.append("to be run again")
    if one.why:
        parts.append(one.why)
    due = int(shop.orders.due_s[shop.operations.job[one.operation]])
    if due < at_s and not shop.clock.running:
        parts.append(f"was due {duration(at_s - due)} before this shift")
    return "; ".join(parts)[:MAX_CELL_CHARACTERS]
