"""``shopfloor plan``: from an orders file to an audited plan and its pages."""

from __future__ import annotations

import time
from pathlib import Path
from typing import Annotated, Any

import typer

from shopfloor.cli import common
from shopfloor.cli.files import write_plan
from shopfloor.settings import SETTINGS

TIME_LIMIT: Any = SETTINGS["time-limit"].default
WORKERS: Any = SETTINGS["workers"].default
OBJECTIVE: Any = SETTINGS["objective"].default
SEED: Any = SETTINGS["seed"].default


def plan(
    orders: common.OrdersArgument,
    shop: common.ShopOption = None,
    out: Annotated[
        Path | None,
        typer.Option("--out", metavar="DIR", help="Folder for the files; without it none is written."),
    ] = None,
    start: common.StartOption = None,
    end: common.EndOption = None,
    round_minutes: common.RoundOption = None,
    crew: common.CrewOption = None,
    split: common.SplitOption = False,
    shortest_piece: Annotated[float, common.setting("shortest-piece", metavar="MINUTES", least=0)] = 0,
    objective: Annotated[str, common.setting("objective", metavar="GOALS")] = OBJECTIVE,
    even: common.EvenOption = False,
    time_limit: Annotated[float, common.setting("time-limit", metavar="SECONDS", least=0)] = TIME_LIMIT,
    workers: Annotated[int, common.setting("workers", metavar="N", least=0)] = WORKERS,
    seed: Annotated[int, common.setting("seed", metavar="N")] = SEED,
    stamp: Annotated[str | None, common.setting("stamp", metavar="TEXT")] = None,
    codes: Annotated[
        str | None, typer.Option("--codes", metavar="KIND", help="Print qr or code128 codes on the sheets.")
    ] = None,
    xlsx: Annotated[bool, typer.Option("--xlsx/--no-xlsx", help="Write plan.xlsx too.")] = True,
    ics: Annotated[
        str | None,
        typer.Option(
            "--ics", metavar="BY", help="Write calendars too: plan for one of all, machine for one a machine."
        ),
    ] = None,
    as_json: common.JsonOption = False,
    quiet: common.QuietOption = False,
) -> None:
    """Plan the orders as early as can be proved, audit the plan, and write its files.

    Exit code 0: done. 1: the plan overruns the shift. 2: bad input. 3: no plan in the time given.
    """
    from shopfloor.errors import InputError

    common.one_of("--codes", codes, ("qr", "code128"))
    common.one_of("--ics", ics, ("plan", "machine"))
    goals = tuple(goal.strip() for goal in objective.split(","))
    for goal in goals:
        common.one_of("--objective", goal, ("makespan", "tardiness", "changeovers"))
    if len(set(goals)) < len(goals):
        raise typer.BadParameter("names a goal twice", param_hint="--objective")
    try:
        reading = common.read(orders, shop, start, end, round_minutes, crew=crew, split=split)
    except InputError as error:
        common.refuse(error, as_json)
    from shopfloor import pipeline
    from shopfloor.cli.progress import Reporter, stopping

    common.see_that_it_can_be_written(out)
    common.print_notices(reading.notices, quiet or as_json)
    report = Reporter(reading.shop.clock, quiet)
    began = time.perf_counter()
    with stopping() as stop:
        made = pipeline.plan(
            reading.shop,
            pipeline.Options(
                time_limit_s=time_limit,
                workers=workers,
                seed=seed,
                even=even,
                objective=goals,
                shortest_piece_s=round(shortest_piece * 60),
            ),
            inputs=reading.inputs,
            report=report,
            stop=stop,
        )
    report.close()
    solve_s = time.perf_counter() - began
    written = [] if out is None else write_plan(made, out, stamp=stamp, codes=codes, xlsx=xlsx, ics=ics)
    if as_json:
        from shopfloor.render.tables import summary

        data = {**summary(made), "files": [str(path) for path in written], "solve_s": round(solve_s, 3)}
        common.print_json({**data, "notices": [common.fault_data(notice) for notice in reading.notices]})
    elif not quiet:
        from shopfloor.render import text

        lines = text.plan_lines(made)
        if written:
            lines += ["", text.wrap(f"Wrote {', '.join(str(path) for path in written)}.")]
        print("\n".join([*lines, "", text.wrap(text.CARE)]))
    raise typer.Exit(common.NO if made.fits_shift is False else common.DONE)
