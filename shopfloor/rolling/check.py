"""The audits of a replan. They share nothing with what made it."""

from __future__ import annotations

from collections import Counter

from shopfloor.audit.schedule import audit
from shopfloor.errors import AuditError
from shopfloor.model.actuals import ShiftState
from shopfloor.model.results import Choice, Plan
from shopfloor.model.stated import state as stated
from shopfloor.replan.current import Current
from shopfloor.replan.frozen import audit_frozen
from shopfloor.replan.residual import Residual
from shopfloor.rolling.archive import Candidate
from shopfloor.rolling.bench import Bench


def check(
    rest: Residual, bench: Bench, chosen: Candidate, made: Plan, now: Current, here: ShiftState
) -> None:
    """Audit a plan three times: strictly from begin on, as it is written, and against the journal.

    Raises
    ------
    AuditError
        If it breaks a rule, which is a bug of ours.
    """
    strict = bench.schedules(chosen.timed)[0]
    blank = Choice("", "", {})
    violations = audit(rest.solve, stated(Plan(rest.solve, strict, (), blank)))
    violations += audit(made.shop, stated(made))
    columns = now.shop.operations
    wanted: Counter[tuple[str, str]] = Counter()
    cut = set()
    for job, machine, splittable in zip(
        columns.job.tolist(), columns.machine.tolist(), columns.splittable.tolist(), strict=True
    ):
        pair = now.shop.orders.ids[job], now.shop.machines[machine].id
        wanted[pair] += 1
        if splittable:
            cut.add(pair)
    out = {(now.shop.machines[out.machine].id, out.unit): out.until_s for out in rest.look.outs}
    whole = {pair: need for pair, need in wanted.items() if pair not in cut}
    violations += audit_frozen(stated(made), here, whole, now.shop.clock, out)
    if violations:
        raise AuditError(violations)
