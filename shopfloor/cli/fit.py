"""``shopfloor fit``: which orders to run this shift and which to carry over."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Any

import typer

from shopfloor.cli import common
from shopfloor.settings import SETTINGS

TIME_LIMIT: Any = SETTINGS["time-limit"].default
SEED: Any = SETTINGS["seed"].default


def fit(
    orders: common.OrdersArgument,
    shop: common.ShopOption = None,
    out: Annotated[
        Path | None,
        typer.Option(
            "--out", metavar="DIR", help="Folder for chosen.csv and carried.csv; without it none is written."
        ),
    ] = None,
    must: Annotated[
        list[str] | None,
        typer.Option("--must", metavar="ORDER", help="An order that has to run; repeatable."),
    ] = None,
    never: Annotated[
        list[str] | None,
        typer.Option("--not", metavar="ORDER", help="An order that has to wait; repeatable."),
    ] = None,
    by: Annotated[
        str, typer.Option("--by", metavar="WHAT", help="Choose whole orders, or single operations.")
    ] = "orders",
    start: common.StartOption = None,
    end: common.EndOption = None,
    round_minutes: common.RoundOption = None,
    crew: common.CrewOption = None,
    split: common.SplitOption = False,
    time_limit: Annotated[float, common.setting("time-limit", metavar="SECONDS", least=0)] = TIME_LIMIT,
    seed: Annotated[int, common.setting("seed", metavar="N")] = SEED,
    as_json: common.JsonOption = False,
    quiet: common.QuietOption = False,
) -> None:
    """Choose what fits the shift, most priority first, with proof that it fits; the rest is carried over.

    Exit code 0: done. 2: bad input. 3: the pinned orders do not fit, or no choice in the time given.
    """
    from shopfloor.errors import InputError

    common.one_of("--by", by, ("orders", "operations"))
    try:
        reading = common.read(orders, shop, start, end, round_minutes, crew=crew, split=split)
        from shopfloor.cli.progress import Reporter, stopping
        from shopfloor.fit.choose import fit as choose_fit
        from shopfloor.pipeline import Options

        common.see_that_it_can_be_written(out)
        report = Reporter(reading.shop.clock, quiet)
        with stopping() as stop:
            found = choose_fit(
                reading.shop,
                must=must or (),
                never=never or (),
                by=by,
                options=Options(time_limit_s=time_limit, seed=seed),
                report=report,
                stop=stop,
            )
        report.close()
    except InputError as error:
        common.refuse(error, as_json)
    from shopfloor.render.orders_file import orders_csv
    from shopfloor.render.save import save

    reasons = {row.order: row.reason for row in found.carried}
    files: list[Path] = []
    if out is not None:
        chosen, carried = orders_csv(found.shop, found.chosen), orders_csv(found.shop, ~found.chosen, reasons)
        files = save(out, {"chosen.csv": chosen, "carried.csv": carried})
    if as_json:
        common.print_json(_data(found, files))
    elif not quiet:
        common.print_notices(reading.notices, quiet)
        _print(found, files)


def _data(found: Any, files: list[Path]) -> dict[str, Any]:
    return {
        "ok": True,
        "chosen": list(found.plan.shop.orders.ids),
        "carried": [{"order": row.order, "reason": row.reason} for row in found.carried],
        "value": found.value,
        "value_bound": found.value_bound,
        "value_relaxed": found.relaxed,
        "proved_best": found.proved,
        "answer": found.sentence,
        "makespan_s": found.plan.makespan_s,
        "lower_bound_s": found.plan.lower_bound_s,
        "fits_shift": found.plan.fits_shift,
        "files": [str(path) for path in files],
    }


def _print(found: Any, files: list[Path]) -> None:
    from shopfloor.render import text

    clock = found.shop.clock
    print(
        text.wrap(
            f"{len(found.plan.shop.orders)} of {len(found.shop.orders)} orders run this shift and end "
            f"{clock.say(found.plan.makespan_s)}; {len(found.carried)} wait. Priority chosen {found.value:g} "
            f"of at most {found.value_bound:g}."
        )
    )
    print(text.wrap(found.sentence))
    if found.carried:
        print("\nCarried over:")
        print("\n".join(text.wrap(f"{text.cut(row.order, 30)}: {row.reason}", 2) for row in found.carried))
    if files:
        print("\n" + text.wrap(f"Wrote {' and '.join(str(path) for path in files)}."))
    print("\n" + text.wrap(text.CARE))
