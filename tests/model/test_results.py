"""Plans as values: what they claim, and what a notebook shows of them."""

from __future__ import annotations

from shopfloor.model.results import Choice, Fault, Plan
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Machine, Operations, Orders, Shop


def plan_of(name: str) -> Plan:
    shop = Shop((Machine("A"),), Orders((name,), due_s=[60]), Operations([0], [0], [120]), shift_end_s=100)
    return Plan(shop, Schedule([0], [0], [120]), (), Choice("general", "because", {}))


def test_a_notebook_shows_a_summary_with_names_as_text() -> None:
    html = plan_of("<script>alert(1)</script>")._repr_html_()
    assert "<script>" not in html
    assert "&lt;script&gt;" in html
    assert "not a permit" in html


def test_late_orders_and_fit() -> None:
    plan = plan_of("J")
    assert [(row.order, row.late_s) for row in plan.late_orders()] == [("J", 60)]
    assert plan.fits_shift is False


def test_to_frame_has_the_columns_of_plan_csv() -> None:
    columns = list(plan_of("J").to_frame().columns)
    assert columns[:5] == ["order", "machine", "unit", "start", "end"]
    assert {"round", "part", "parts", "note"} <= set(columns)


def test_a_fault_says_place_value_problem_and_advice() -> None:
    fault = Fault(
        "orders.csv", 7, "minutes", "-5", "minutes-not-positive", "is not positive", "write the run time"
    )
    assert fault.text() == "orders.csv row 7, column minutes: '-5' is not positive; write the run time"
