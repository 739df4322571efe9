"""Generated shops, shared by every test that states a property."""

from __future__ import annotations

import numpy as np
from hypothesis import strategies as st

from shopfloor.model.shop import NO_DUE, NO_STEP, Machine, Operations, Orders, Shop


@st.composite
def shops(
    draw: st.DrawFn,
    *,
    max_orders: int = 4,
    max_machines: int = 3,
    max_operations: int = 6,
    max_seconds: int = 5,
    unit: bool = False,
    releases: bool = True,
    steps: bool = True,
    dues: bool = True,
    groups: bool = False,
    parallel: bool = True,
) -> Shop:
    """Small shops; every order and machine index may be hit, several times where `parallel`."""
    orders = draw(st.integers(1, max_orders))
    machines = draw(st.integers(1, max_machines))
    pair = st.tuples(st.integers(0, orders - 1), st.integers(0, machines - 1))
    pairs = draw(st.lists(pair, min_size=1, max_size=max_operations, unique=not parallel))
    size = len(pairs)
    length = draw(st.integers(1, max_seconds))
    each = st.just(length) if unit else st.integers(1, max_seconds)
    seconds = draw(st.lists(each, min_size=size, max_size=size))
    release = [draw(st.integers(0, 6)) if releases else 0 for _ in range(orders)]
    due = [draw(st.one_of(st.none(), st.integers(0, 15))) if dues else None for _ in range(orders)]
    step = [draw(st.one_of(st.just(NO_STEP), st.integers(0, 2))) if steps else NO_STEP for _ in range(size)]
    counts = [draw(st.integers(1, 3)) if groups else 1 for _ in range(machines)]
    return Shop(
        machines=tuple(Machine(f"M{k}", count=counts[k]) for k in range(machines)),
        orders=Orders(
            tuple(f"J{k}" for k in range(orders)),
            release_s=np.array(release),
            due_s=np.array([NO_DUE if d is None else max(d, r) for d, r in zip(due, release, strict=True)]),
            priority=np.array([draw(st.sampled_from([0.5, 1.0, 2.0])) for _ in range(orders)]),
        ),
        operations=Operations([a for a, _ in pairs], [b for _, b in pairs], seconds, step=step),
    )


@st.composite
def colourings(
    draw: st.DrawFn, *, max_rounds: int = 7, max_orders: int = 6
) -> tuple[np.ndarray, np.ndarray, int]:
    """Colour and order of each operation, every colour used, and the number of colours."""
    rounds = draw(st.integers(1, max_rounds))
    orders = draw(st.integers(1, max_orders))
    pair = st.tuples(st.integers(0, rounds - 1), st.integers(0, orders - 1))
    pairs = draw(st.sets(pair, max_size=18)) | {(r, draw(st.integers(0, orders - 1))) for r in range(rounds)}
    ordered = sorted(pairs)
    return np.array([c for c, _ in ordered]), np.array([j for _, j in ordered]), rounds
