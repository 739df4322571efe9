"""How far the best plan found stands above each lower bound of weighted lateness, on the fifteen shifts.

    python -m tests.bench.lateness                     some three minutes
    python -m tests.bench.lateness --sizes S --seconds 30

Weighted lateness is in priority × minutes. Beside each bound stands the best plan found as a multiple of it;
"any" where the bound is nothing, though a plan is late. Plans are of list schedules and their improvement
alone (``floor_plan``), for lateness alone; so a part of each gap is the plan's own.
"""

from __future__ import annotations

import argparse
import time

from shopfloor.bounds.lateness import EVERYTHING, Parts, least_lateness
from shopfloor.openshop.floor.plan import floor_plan
from shopfloor.openshop.incumbent import TARDINESS
from shopfloor.openshop.method import Effort
from tests.bench.shifts import SEEDS, SIZES, lateness, shift

UNIT = 60_000  # thousandths of priority × seconds in priority × minutes
IDEAS = {
    "each order alone": Parts(machines=False, crews=False),
    "best single machine": Parts(crews=False, changeovers=False, shared=False),
    "… with changeovers": Parts(crews=False, shared=False),
    "crew": Parts(machines=False),
    "machines shared": Parts(crews=False, changeovers=False),
    "everything": EVERYTHING,
}


def cell(bound: float, plan: float) -> str:
    """Return a bound and how many times the plan is above it."""
    if not plan:
        return f"{bound:,.0f} (met)"
    return f"{bound:,.0f} ({plan / bound:.1f}×)" if bound else "0 (any)"


def row(size: str, seed: int, seconds: float) -> str:
    """Return the line of one shop."""
    shop = shift(size, seed)
    outcome = floor_plan(shop, (TARDINESS,), Effort(time_limit_s=seconds))
    assert outcome.schedule is not None
    plan = lateness(shop, outcome.schedule)
    cells = []
    took = 0.0
    for parts in IDEAS.values():
        began = time.perf_counter()
        bound = least_lateness(shop, parts).value / UNIT
        took = time.perf_counter() - began
        assert bound <= plan, "a bound above a plan is none"
        cells.append(cell(bound, plan))
    return f"| {' | '.join([f'{size} {seed}', f'{plan:,.0f}', *cells, f'{took:.2f}'])} |"


def main() -> None:
    """Print one row a shop."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawTextHelpFormatter)
    parser.add_argument("--seconds", type=float, default=5.0, help="time for each plan")
    parser.add_argument("--sizes", nargs="*", default=list(SIZES), choices=list(SIZES))
    parser.add_argument("--seeds", nargs="*", type=int, default=list(SEEDS))
    arguments = parser.parse_args()
    columns = ["shop", "plan", *IDEAS, "everything, s"]
    print(f"| {' | '.join(columns)} |")
    print("|" + " --- |" * len(columns))
    for size in arguments.sizes:
        for seed in arguments.seeds:
            print(row(size, seed, arguments.seconds), flush=True)


if __name__ == "__main__":
    main()
