"""Which orders fit: against exhaustive choice on small shops, and SciPy's milp and linprog on larger ones."""

from __future__ import annotations

from itertools import product

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from scipy.optimize import Bounds, LinearConstraint, linprog, milp

from shopfloor.errors import InputError, NoPlanError
from shopfloor.fit.budget import budget
from shopfloor.fit.choose import fit
from shopfloor.model.shop import NO_DUE, Machine, Operations, Orders, Shop
from shopfloor.pipeline import Options

ROUND = 1800


def unit_shop(
    rng: np.random.Generator, orders: int, machines: int, rounds: int, *, late: bool = False
) -> Shop:
    job, machine = [], []
    for j in range(orders):
        for m in rng.choice(machines, size=min(machines, int(rng.integers(1, 5))), replace=False):
            job.append(j)
            machine.append(int(m))
    due = np.where(rng.random(orders) < 0.2, -60, NO_DUE) if late else np.full(orders, NO_DUE)
    return Shop(
        tuple(Machine(f"M{m}") for m in range(machines)),
        Orders(
            tuple(f"J{j}" for j in range(orders)), due_s=due, priority=rng.choice([1.0, 2.0, 5.0], orders)
        ),
        Operations(job, machine, [ROUND] * len(job)),
        shift_end_s=rounds * ROUND,
    )


def machine_need(shop: Shop) -> np.ndarray:
    need = np.zeros((len(shop.machines), len(shop.orders)))
    np.add.at(need, (shop.operations.machine, shop.operations.job), 1)
    return need


@given(st.integers(0, 10_000), st.booleans())
@settings(max_examples=25, deadline=None)
def test_whole_orders_against_every_subset(seed: int, late: bool) -> None:
    rng = np.random.default_rng(seed)
    shop = unit_shop(rng, 7, 3, int(rng.integers(2, 5)), late=late)
    rounds = shop.shift_end_s // ROUND
    need, value = machine_need(shop), shop.orders.priority
    first = shop.orders.due_s <= 0
    best = max(
        (value[take & first].sum(), value[take].sum())
        for take in map(np.array, product([False, True], repeat=7))
        if (need[:, take].sum(axis=1) <= rounds).all() and (need.sum(axis=0)[take] <= rounds).all()
    )  # fmt: skip
    assume(best[1] > 0)
    found = fit(shop)
    names = set(found.plan.shop.orders.ids)
    taken = np.array([name in names for name in shop.orders.ids])
    assert (value[taken & first].sum(), value[taken].sum()) == best
    assert found.plan.fits_shift
    assert found.proved or late
    assert found.sentence.startswith("Guaranteed")


def test_whole_orders_against_scipy_milp_on_a_larger_shop() -> None:
    shop = unit_shop(np.random.default_rng(5), 120, 12, 16)
    need, value = machine_need(shop), shop.orders.priority
    oracle = milp(
        -value, constraints=LinearConstraint(need, ub=16), integrality=np.ones(120), bounds=Bounds(0, 1)
    )
    relaxed = linprog(-value, A_ub=need, b_ub=np.full(12, 16), bounds=(0, 1))
    found = fit(shop, options=Options(time_limit_s=20))
    assert found.proved
    assert found.value == pytest.approx(-oracle.fun)
    assert found.relaxed == pytest.approx(-relaxed.fun)
    assert found.plan.proved_optimal
    assert found.plan.makespan_s <= shop.shift_end_s


def test_single_operations_are_a_flow_against_scipy_linprog() -> None:
    """The flow's polytope is whole (totally unimodular), so linprog's optimum is the exact answer."""
    for seed in range(4):
        shop = unit_shop(np.random.default_rng(seed), 60, 6, 8)
        job, machine = shop.operations.job, shop.operations.machine
        rows = np.zeros((66, len(job)))
        rows[job, np.arange(len(job))] = 1
        rows[60 + machine, np.arange(len(job))] = 1
        value = shop.orders.priority[job]
        oracle = linprog(-value, A_ub=rows, b_ub=np.full(66, 8), bounds=(0, 1))
        found = fit(shop, by="operations")
        assert found.value == pytest.approx(-oracle.fun)
        assert found.plan.fits_shift


def test_pins_are_kept_and_every_carried_order_has_a_reason() -> None:
    shop = unit_shop(np.random.default_rng(1), 30, 3, 6)
    found = fit(shop, must=["J3"], never=["J4"])
    chosen = set(found.plan.shop.orders.ids)
    assert "J3" in chosen
    assert "J4" not in chosen
    reasons = {row.order: row.reason for row in found.carried}
    assert reasons["J4"] == "taken out with --not"
    assert set(reasons) == set(shop.orders.ids) - chosen
    assert all("full" in reason for order, reason in reasons.items() if order != "J4")


def test_pins_that_cannot_be_kept_are_refused() -> None:
    shop = unit_shop(np.random.default_rng(1), 30, 3, 6)
    with pytest.raises(
        NoPlanError, match=r"the orders given with --must need more of M\d than the shift has"
    ):
        fit(shop, must=shop.orders.ids)
    with pytest.raises(InputError, match="'J99' is not among the orders"):
        fit(shop, must=["J99"])
    with pytest.raises(InputError, match="'J1' is also given with --not"):
        fit(shop, must=["J1"], never=["J1"])


def test_without_an_end_there_is_nothing_to_choose() -> None:
    shop = Shop((Machine("A"),), Orders(("J",)), Operations([0], [0], [60]))
    with pytest.raises(NoPlanError, match="the shift has no end"):
        fit(shop)


def test_different_times_are_confirmed_by_a_plan() -> None:
    rng = np.random.default_rng(2)
    job, machine = np.repeat(np.arange(8), 3), np.tile(np.arange(3), 8)
    shop = Shop(
        tuple(Machine(f"M{m}") for m in range(3)),
        Orders(tuple(f"J{j}" for j in range(8))),
        Operations(job, machine, rng.integers(5, 60, 24) * 60),
        shift_end_s=3 * 3600,
    )
    found = fit(shop, options=Options(time_limit_s=5))
    assert found.plan.fits_shift
    assert found.sentence.startswith("Confirmed by the plan itself")
    assert found.value <= found.value_bound


def test_a_group_and_a_crew_widen_and_narrow_the_budget() -> None:
    shop = Shop(
        (Machine("A", count=2), Machine("B")), Orders(("J", "K", "L")),
        Operations([0, 1, 2], [0, 0, 1], [ROUND] * 3), shift_end_s=ROUND,
    )  # fmt: skip
    assert len(fit(shop).plan.shop.orders) == 3
    assert [limit.room for limit in budget(shop).limits] == [2, 1]
