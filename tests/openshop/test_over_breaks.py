"""Breaks taken out of the clock: what was weighed is said."""

from __future__ import annotations

import pytest

from shopfloor.model.shop import Closure, Machine, Operations, Orders, Shop
from shopfloor.openshop.general import General
from shopfloor.openshop.method import Effort
from shopfloor.openshop.over_breaks import IN_WORKING_TIME, OverBreaks


@pytest.mark.parametrize(("due_s", "late"), [(15, True), (30, False)])
def test_lateness_in_working_time_is_called_that(due_s: int, late: bool) -> None:
    """Twenty seconds of work over a break of ten: 15 s late on the clock, 10 in working time."""
    shop = Shop(
        (Machine("LAP", pauses=True),), Orders(("J",), due_s=[due_s]), Operations([0], [0], [20]),
        breaks=(Closure(10, 20, "tea"),),
    )  # fmt: skip
    outcome = OverBreaks(General()).solve(shop, Effort(bound_s=30))
    assert outcome.schedule is not None
    assert outcome.schedule.end_s.tolist() == [30]
    weighed = "Weighted lateness is 10 s (priority × time late, summed); no plan of this makespan has less."
    assert outcome.remarks == ((weighed, IN_WORKING_TIME) if late else ("Nothing is late.",))
