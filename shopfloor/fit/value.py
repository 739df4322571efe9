"""What an order is worth to this shift: orders already late first, then by priority."""

from __future__ import annotations

import numpy as np

from shopfloor.model.shop import Bools, Ints, Shop

PRIORITY_UNIT = 1_000  # priorities have at most three decimals: exact as whole thousandths


def already_late(shop: Shop) -> Bools:
    """Return which orders were due at or before the shift's start."""
    late: Bools = shop.orders.due_s <= 0
    return late


def worth(shop: Shop) -> Ints:
    """Return each order's priority in whole thousandths."""
    return np.rint(shop.orders.priority * PRIORITY_UNIT).astype(np.int64)


def ranked_worth(shop: Shop) -> Ints:
    """Return one number an order in which any already late order outweighs all others together.

    Raises
    ------
    OverflowError
        If the sums leave 64 bits, which needs more than a million orders of the highest priority.
    """
    value, late = worth(shop), already_late(shop)
    step = int(value[~late].sum()) + 1 if late.any() else 1
    if int(value.sum()) * step >= 2**62:
        raise OverflowError("priorities are too large to rank late orders first")
    ranked: Ints = np.where(late, value * step, value)
    return ranked
