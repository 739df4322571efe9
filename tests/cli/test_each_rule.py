"""Each rule of the mixed hall's shop.toml, taken away, changes the answer in the direction it should."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from shopfloor.audit.schedule import audit
from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.model.results import Choice, Plan
from shopfloor.model.shop import Shop
from shopfloor.model.stated import state
from shopfloor.openshop.floor.plan import floor_plan
from shopfloor.openshop.incumbent import GOALS
from shopfloor.openshop.method import Effort
from shopfloor.read.orders import read_orders

MIXED = Path(__file__).parents[2] / "data" / "mixed"
TEXT = (MIXED / "shop.toml").read_text("utf-8")
UP, DOWN = "up", "down"

# The lines taken away, the line of the hall that feels it, and which way its bound goes.
RULES = {
    "breaks": (r"breaks = \[.*?^\]\n", "WASH", DOWN),
    "closure": (r"closed = .*?\n", "PRESS-TEST", DOWN),
    "set-up": (r"setup_minutes = 10\n", "BALANCE", DOWN),
    "units": (r"count = 2.*?\n", "CMM", UP),
    "changeovers": (r"\[changeover\.COAT\].*?^\]\n", "COAT", DOWN),
    "heads": (r"^heads = 2\n", "fitters", DOWN),
    "attended": (r'attended = "set-up".*?\n', "fitters", UP),
}
# Rules without which there are more plans: every plan of the hall is one of the freer hall. The second entry
# is what a plan made without the rule breaks, if anything; here crew and first family hinder nothing.
FREER = {
    "closure": (RULES["closure"][0], "closure"),
    "changeovers": (RULES["changeovers"][0], "changeover"),
    "transport": (r"\[transport\].*?^between = 5\n", "transport"),
    "heads": (RULES["heads"][0], None),
    "first family": (r'family = "grey".*?\n', None),
    "heads by interval": (r"levels = .*?\n", None),
}


def hall(tmp_path: Path, without: str | None) -> Shop:
    text = TEXT
    if without is not None:
        text, count = re.subn(without, "", TEXT, count=1, flags=re.S | re.M)
        assert count == 1
    shop_toml = tmp_path / "shop.toml"
    shop_toml.write_text(text, "utf-8")
    return read_orders(MIXED / "orders.csv", shop=shop_toml)


def bound_s(shop: Shop, line: str) -> int:
    return max(bound.value_s for bound in lower_bounds(shop) if line in bound.witness.values())


def listed(shop: Shop) -> Plan:
    """What the lists and a little improvement come to, with no clock but their own steps."""
    best = lower_bounds(shop)[0].value_s
    outcome = floor_plan(shop, GOALS, Effort(bound_s=best, time_limit_s=1e9), rounds=1)
    assert outcome.schedule is not None
    return Plan(shop, outcome.schedule, (), Choice("", "", {}))


@pytest.mark.parametrize("rule", RULES)
def test_a_rule_taken_away_moves_the_bound_of_its_line(tmp_path: Path, rule: str) -> None:
    lines, line, way = RULES[rule]
    before, after = (bound_s(hall(tmp_path, without), line) for without in (None, lines))
    assert after > before if way == UP else after < before


def test_what_binds_lets_the_shift_end_earlier_once_it_is_gone(tmp_path: Path) -> None:
    best = lower_bounds(hall(tmp_path, None))[0]
    for rule in ("breaks", "closure"):
        assert listed(hall(tmp_path, RULES[rule][0])).makespan_s < best.value_s
    assert bound_s(hall(tmp_path, RULES["units"][0]), "CMM") > listed(hall(tmp_path, None)).makespan_s


@pytest.mark.parametrize("rule", FREER)
def test_without_a_rule_there_are_more_plans(tmp_path: Path, rule: str) -> None:
    lines, broken = FREER[rule]
    whole, freer = hall(tmp_path, None), hall(tmp_path, lines)
    assert not audit(freer, state(listed(whole)))
    found = {violation.rule for violation in audit(whole, state(listed(freer)))}
    assert found == (set() if broken is None else {broken})
