"""The decision model of small shops: is there a schedule no longer than this?

Beside or instead of no-overlap, every two operations on one line have a Boolean that tells which comes
first: clause learning works on these. Two things make the search smaller, and neither loses the answer:

* A line of load L has T - L of idle time in a schedule of length T. So an operation starts at a sum of
  some others of its line plus at most T - L, on its order and on its machine alike.
* Where nothing tells forwards from backwards (no releases, no steps), a schedule mirrored in time is
  one too. So one pair, that with most work, may be put in a fixed sequence.
"""

from __future__ import annotations

from itertools import combinations

import numpy as np
from ortools.sat.python import cp_model

from shopfloor.model.shop import Ints, Shop
from shopfloor.openshop.cpsat.variables import Model

MOST_MOMENTS, MOST_PIECES, EVERYWHERE = 1 << 19, 1_000, 8


def reversible(shop: Shop) -> bool:
    """Whether a schedule run backwards is a schedule."""
    return not shop.has_steps and not shop.orders.release_s.any()


def pair_count(shop: Shop) -> int:
    """Return how many Booleans :func:`order_pairs` would need."""
    counts = shop.operations
    sizes: dict[tuple[str, int], int] = {}
    for job, machine in zip(counts.job.tolist(), counts.machine.tolist(), strict=True):
        sizes["order", job] = sizes.get(("order", job), 0) + 1
        if shop.machines[machine].count == 1:
            sizes["machine", machine] = sizes.get(("machine", machine), 0) + 1
    return sum(size * (size - 1) // 2 for size in sizes.values())


def order_pairs(model: Model, *, mirror: bool = False) -> tuple[int, int] | None:
    """Give each pair on a line a Boolean for its sequence.

    With `mirror`, for a shop that is :func:`reversible`, the pair with the largest sum of times is put
    in a fixed sequence, and returned.
    """
    heaviest: tuple[int, int, int] | None = None
    first_before: dict[tuple[int, int], cp_model.IntVar] = {}
    for line in model.lines:
        for a, b in combinations(line, 2):
            if (a, b) in first_before or (b, a) in first_before:
                continue  # the same order on the same machine again: both lines say the same
            before = model.cp.new_bool_var("")
            model.cp.add(model.end(a) <= model.start[b]).only_enforce_if(before)
            model.cp.add(model.end(b) <= model.start[a]).only_enforce_if(~before)
            first_before[a, b] = before
            weight = model.seconds[a] + model.seconds[b]
            if heaviest is None or weight > heaviest[0]:
                heaviest = (weight, a, b)
    if not mirror or heaviest is None:
        return None
    _, a, b = heaviest
    model.cp.add(first_before[a, b] == 1)
    return a, b


def cut_starts(model: Model) -> None:
    """Let each start only be where the idle time of its lines allows it; for models of whole shops.

    Where that leaves very many pieces, or the plan has very many moments, it is left out: it would cost
    more than it cuts.
    """
    if model.latest > MOST_MOMENTS:
        return
    allowed: dict[int, int] = {}
    for line in model.lines:
        idle = model.latest - sum(model.seconds[operation] for operation in line)
        if idle < 0:
            model.cp.add_bool_or([])  # the line alone is longer: no solution
            return
        if (idle + 1) << (len(line) - 1) > EVERYWHERE * model.latest:
            continue  # so many sums, each with so much room: they leave hardly a moment out
        for operation in line:
            others = [model.seconds[other] for other in line if other != operation]
            allowed[operation] = allowed.get(operation, -1) & _widen(_sums(others), idle)
    for operation, bits in allowed.items():
        spans = _spans(bits & ((1 << (model.latest - model.seconds[operation] + 1)) - 1))
        if not spans:
            model.cp.add_bool_or([])
            return
        if len(spans) <= MOST_PIECES:
            domain = cp_model.Domain.from_intervals(spans)
            model.cp.add_linear_expression_in_domain(model.start[operation], domain)


def mirrored(shop: Shop, start_s: Ints) -> Ints:
    """Return the schedule run backwards from its makespan."""
    end = start_s + shop.operations.seconds
    back: Ints = end.max() - end
    return back


def _sums(values: list[int]) -> int:
    """Return the sums of all subsets as a bit set."""
    bits = 1
    for value in values:
        bits |= bits << value
    return bits


def _widen(bits: int, width: int) -> int:
    """Return the bit set with each element x made into x … x + width."""
    have = 1
    while have <= width:
        step = min(have, width + 1 - have)
        bits |= bits << step
        have += step
    return bits


def _spans(bits: int) -> list[list[int]]:
    """Return the runs of set bits as [first, last]."""
    raw = np.frombuffer(bits.to_bytes(bits.bit_length() // 8 + 1, "little"), np.uint8)
    edges = np.flatnonzero(
        np.diff(np.unpackbits(raw, bitorder="little").astype(np.int8), prepend=0, append=0)
    )
    return [[first, after - 1] for first, after in edges.reshape(-1, 2).tolist()]
