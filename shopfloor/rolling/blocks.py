"""Units of groups that are not free from begin on, told as operations of a shop."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import replace
from typing import NamedTuple

import numpy as np

from shopfloor.model.shop import NO_DUE, NO_FAMILY, NO_STEP, Operations, Orders, Shop
from shopfloor.replan.residual import Residual


class Block(NamedTuple):
    """A unit of a group that is not free from begin until `until_s`, or was last used for `family`."""

    machine: int
    unit: int
    until_s: int
    family: str | None


def blocks_of(rest: Residual) -> Iterator[Block]:
    """Yield what keeps single units of groups from the rest; of whole machines, closures tell."""
    shop, look = rest.solve, rest.look
    for out in look.outs:
        if out.unit and shop.machines[out.machine].count > 1:
            yield Block(out.machine, out.unit, max(0, out.until_s - rest.begin_s), None)
    for one in rest.held:
        if shop.machines[one.machine].count > 1:
            yield Block(one.machine, one.unit, max(0, one.ends_s - rest.begin_s), None)
    runs = {(one.machine, one.unit) for one in rest.pinned.values()}
    for place, hall in enumerate(shop.machines):
        if hall.count == 1 or hall.id not in shop.changeovers:
            continue
        until = {one.unit: one.until_s - rest.begin_s for one in look.changing if one.machine == place}
        for unit in range(1, hall.count + 1):
            family = look.families.get((place, unit))
            if family is not None and (place, unit) not in runs:
                yield Block(place, unit, max(0, until.get(unit, 0)), family)


def with_blocks(shop: Shop, blocks: Sequence[Block]) -> Shop:
    """Return the shop with one operation more for each block, in the same order, each of its own order."""
    if not blocks:
        return shop
    columns, orders, more = shop.operations, shop.orders, len(blocks)
    families = tuple(dict.fromkeys([*shop.families, *(block.family for block in blocks if block.family)]))
    index = {name: place for place, name in enumerate(families)}
    extra = {
        "job": [len(orders) + k for k in range(more)],
        "machine": [block.machine for block in blocks],
        "seconds": [max(1, block.until_s) for block in blocks],
        "step": [NO_STEP] * more,
        "splittable": [0] * more,
        "heads": [0] * more,
        "family": [index[block.family] if block.family else NO_FAMILY for block in blocks],
        "setup_s": [0] * more,
        "row": [0] * more,
    }
    return replace(
        shop,
        families=families,
        orders=Orders(
            (*orders.ids, *(f"\0block {k}" for k in range(more))),
            np.r_[orders.release_s, np.zeros(more, np.int64)],
            np.r_[orders.due_s, np.full(more, NO_DUE)],
            np.r_[orders.priority, np.ones(more)],
        ),
        operations=Operations(
            **{name: np.r_[getattr(columns, name), values] for name, values in extra.items()}
        ),
    )
