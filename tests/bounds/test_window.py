"""The window bound is Jackson's preemptive one-machine relaxation: checked against SciPy's milp.

J. R. Jackson (1955); J. Carlier, E.J.O.R. 11 (1982) 42-47: preemptive work with heads and tails ends at the
largest h + load + q over all thresholds.
"""

from __future__ import annotations

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import Bounds, LinearConstraint, milp

from shopfloor.audit.witness import rederive
from shopfloor.bounds.window import window_bounds
from shopfloor.model.shop import Machine, Operations, Orders, Shop


def one_machine(jobs: list[tuple[int, int, int]]) -> Shop:
    """Each job (head, time, tail) visits A, then a machine of its own for its tail."""
    size = len(jobs)
    machines = (Machine("A"), *(Machine(f"T{k}") for k in range(size)))
    return Shop(
        machines,
        Orders(tuple(f"J{k}" for k in range(size)), release_s=[head for head, _, _ in jobs]),
        Operations(
            [k for k in range(size) for _ in range(2)],
            [m for k in range(size) for m in (0, k + 1)],
            [t for _, time, tail in jobs for t in (time, tail)],
            step=[1, 2] * size,
        ),
    )


def by_milp(jobs: list[tuple[int, int, int]]) -> int:
    """Least end of preemptive work on one machine, by a model in unit slots."""
    horizon = max(head for head, _, _ in jobs) + sum(time for _, time, _ in jobs)
    size, slots = len(jobs), horizon
    columns = size * slots + 1  # x[j, t] …, and the end
    cost = np.zeros(columns)
    cost[-1] = 1
    rows, low, high = [], [], []
    upper = np.ones(columns)
    upper[-1] = np.inf
    for j, (head, time, tail) in enumerate(jobs):
        need = np.zeros(columns)
        need[j * slots : (j + 1) * slots] = 1
        rows.append(need), low.append(time), high.append(time)
        upper[j * slots : j * slots + head] = 0
        for t in range(slots):
            ends = np.zeros(columns)
            ends[j * slots + t], ends[-1] = t + 1 + tail, -1
            rows.append(ends), low.append(-np.inf), high.append(0)
    for t in range(slots):
        once = np.zeros(columns)
        once[t : size * slots : slots] = 1
        rows.append(once), low.append(0), high.append(1)
    integral = np.ones(columns)
    integral[-1] = 0
    found = milp(cost, constraints=LinearConstraint(np.array(rows), low, high), integrality=integral,
                 bounds=Bounds(0, upper))  # fmt: skip
    return round(found.fun)


@given(st.lists(st.tuples(st.integers(0, 6), st.integers(1, 4), st.integers(1, 6)), min_size=1, max_size=4))
@settings(max_examples=60, deadline=None)
def test_it_equals_the_preemptive_optimum_of_the_machine(jobs) -> None:
    shop = one_machine(jobs)
    bound = next(b for b in window_bounds(shop) if b.witness["machine"] == "A")
    assert bound.value_s == by_milp(jobs)
    assert rederive(shop, bound) == bound.value_s


def test_the_sentence_says_both_thresholds() -> None:
    shop = one_machine([(60, 600, 300), (0, 60, 60)])
    bound = window_bounds(shop)[0]
    assert bound.sentence == (
        "On A, 10 min of work cannot start before 0:01 and leaves its orders at least 5 min to do elsewhere, "
        "so nothing can end before 0:16."
    )


def test_without_steps_there_are_no_tails_and_no_windows() -> None:
    assert window_bounds(Shop((Machine("A"),), Orders(("J",)), Operations([0], [0], [60]))) == []
