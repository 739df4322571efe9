"""``shopfloor audit``: does a plan, perhaps edited by hand, keep every rule of its orders?"""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from shopfloor.cli import common


def audit(
    plan_file: Annotated[str, typer.Argument(metavar="PLAN", help="plan.csv, plan.json or plan.xlsx.")],
    orders: common.OrdersArgument,
    shop: common.ShopOption = None,
    start: common.StartOption = None,
    end: common.EndOption = None,
    round_minutes: common.RoundOption = None,
    crew: common.CrewOption = None,
    split: common.SplitOption = False,
    as_json: common.JsonOption = False,
    quiet: common.QuietOption = False,
) -> None:
    """Check a plan against its orders, sharing nothing with the methods that made it.

    Exit code 0: clean. 1: it breaks rules, each listed with the rows that clash. 2: bad input.
    """
    from shopfloor.errors import InputError

    try:
        reading = common.read(orders, shop, start, end, round_minutes, crew=crew, split=split)
        from shopfloor.read.plan import load_plan

        stated = load_plan(Path(plan_file), reading.shop)
    except InputError as error:
        common.refuse(error, as_json)
    from shopfloor.audit.schedule import audit as audit_plan
    from shopfloor.audit.witness import audit_bounds
    from shopfloor.render.lines import wrap

    violations = audit_plan(reading.shop, stated)
    notes = audit_bounds(reading.shop, stated)[1]
    if as_json:
        listed = [{"rule": v.rule, "sentence": v.sentence, "rows": list(v.rows)} for v in violations]
        common.print_json(
            {"clean": not violations, "rows": len(stated), "violations": listed, "notes": list(notes)}
        )
    elif not quiet:
        common.print_notices(reading.notices, quiet)
        for violation in violations:
            rows = " and ".join(str(row) for row in violation.rows)
            place = f"rows {rows}: " if len(violation.rows) > 1 else f"row {rows}: " if rows else ""
            print(wrap(f"{place}{violation.sentence}"))
        for note in notes:
            print(wrap(f"Note: {note}"))
        if violations:
            count = "1 violation" if len(violations) == 1 else f"{len(violations)} violations"
            print(f"{Path(plan_file).name}: {count}.")
        else:
            print(f"{Path(plan_file).name}: {len(stated)} rows, every rule kept.")
    raise typer.Exit(common.NO if violations else common.DONE)
