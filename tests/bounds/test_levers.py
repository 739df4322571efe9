"""What would help: each lever's new bound is the bound of the changed shop, and a tie is said to be one."""

from __future__ import annotations

import numpy as np

from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.bounds.levers import tie_sentence, what_would_help
from shopfloor.model.shop import Machine, Operations, Orders, Shop, shop_of


def test_one_binding_machine_has_levers_best_first() -> None:
    shop = shop_of([[3600, 600], [3600, 600], [3600, 600], [3600, 600]])
    levers = what_would_help(shop)
    assert [lever.gain_s for lever in levers] == sorted((lever.gain_s for lever in levers), reverse=True)
    by_kind = {lever.kind: lever for lever in levers}
    assert by_kind["unit"].value_s == 7200
    assert by_kind["hour"].value_s == 10_800
    assert by_kind["carry over"].value_s == 10_800
    assert (
        by_kind["unit"].sentence == "One more unit of M1: nothing before 2:00 instead of 4:00, 2 h earlier."
    )


def test_two_machines_that_tie_are_named_and_only_helped_together() -> None:
    shop = shop_of([[3600, 3600], [3600, 3600], [3600, 3600]])
    bounds = lower_bounds(shop)
    assert tie_sentence(shop, bounds) == (
        "M1 and M2 bind together at 3:00: a lever on one of them alone changes nothing."
    )
    levers = what_would_help(shop, bounds)
    assert [lever.what for lever in levers if lever.kind == "unit"] == ["M1 and M2"]


def test_a_binding_order_is_helped_by_two_lots() -> None:
    shop = shop_of([[3600, 3600, 3600], [600, 0, 0]])
    levers = {lever.kind: lever for lever in what_would_help(shop)}
    assert levers["split order"].value_s < 10_800
    assert levers["split order"].what == "J1"


def test_one_more_head_helps_where_the_crew_binds() -> None:
    shop = Shop(
        tuple(Machine(f"M{k}") for k in range(6)), Orders(tuple(f"J{k}" for k in range(6))),
        Operations(np.arange(6), np.arange(6), [600] * 6),
    ).with_crew(2)  # fmt: skip
    levers = {lever.kind: lever for lever in what_would_help(shop)}
    assert lower_bounds(shop)[0].kind == "crew rounds"
    assert (lower_bounds(shop)[0].value_s, levers["head"].value_s) == (1800, 1200)


def test_nothing_to_do_needs_no_help() -> None:
    assert what_would_help(Shop((), Orders(()), Operations([], [], []))) == ()
