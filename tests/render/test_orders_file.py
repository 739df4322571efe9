"""Orders written by the tool read back as the same shop."""

from __future__ import annotations

import numpy as np
import pytest

from shopfloor.read.orders import load
from shopfloor.render.orders_file import orders_csv
from tests.cli.run import DATA


@pytest.mark.parametrize("name", ["rounds", "crew", "splits", "mixed", "two-machines"])
def test_orders_come_back_as_they_were(name: str) -> None:
    toml = DATA / name / "shop.toml"
    shop = load(DATA / name / "orders.csv", shop=toml).shop
    text = orders_csv(shop, np.ones(len(shop), bool))
    again = load(text.encode(), shop=toml).shop
    assert [str(o)[: str(o).index("row=")] for o in again] == [str(o)[: str(o).index("row=")] for o in shop]
    assert again.orders.due_s.tolist() == shop.orders.due_s.tolist()
    assert again.orders.release_s.tolist() == shop.orders.release_s.tolist()
    assert again.orders.priority.tolist() == shop.orders.priority.tolist()


def test_the_reason_stands_beside_each_carried_row_and_formulas_are_harmless() -> None:
    shop = load(b"order,machine,note\nA,X,=1+1\nB,X,\n").shop
    text = orders_csv(shop, np.array([True, False]), {"A": "X is full"})
    assert text == "order,machine,note,reason\nA,X,'=1+1,X is full\n"
