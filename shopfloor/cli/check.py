"""``shopfloor check``: can this shift hold these orders, and what binds?"""

from __future__ import annotations

from typing import Any

import typer

from shopfloor.cli import common


def check(
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
    """Read and validate orders; show loads, lower bounds, what binds, and whether the shift can hold it.

    Exit code 0: it fits, or the shift's end is not known. 1: it does not fit. 2: bad input.
    """
    from shopfloor.errors import InputError

    try:
        reading = common.read(orders, shop, start, end, round_minutes, crew=crew, split=split)
    except InputError as error:
        common.refuse(error, as_json)
    from shopfloor.pipeline import forecast
    from shopfloor.render import text

    outlook, hall = forecast(reading.shop), reading.shop
    if as_json:
        common.print_json({**_data(outlook), "notices": [common.fault_data(n) for n in reading.notices]})
    elif not quiet:
        common.print_notices(reading.notices, quiet)
        fit = text.fit_line(hall, outlook.lower_bound_s, outlook.reached)
        lines = [text.shift_line(hall), "", *text.bound_lines(outlook.bounds), *([fit] if fit else []), ""]
        helps = ([outlook.tie] if outlook.tie else []) + [lever.sentence for lever in outlook.levers]
        print("\n".join([*lines, *text.load_lines(hall, outlook.bounds), *text.help_lines(helps)]))
    raise typer.Exit(common.NO if outlook.fits is False else common.DONE)


def _data(outlook: Any) -> dict[str, Any]:
    shop = outlook.shop
    start = shop.clock.start
    return {
        "ok": True,
        "shift_start": start.isoformat(timespec="seconds") if start else None,
        "shift_end_s": shop.shift_end_s,
        "operations": len(shop),
        "lower_bound_s": outlook.lower_bound_s,
        "bound_is_reached": outlook.reached,
        "fits_shift": outlook.fits,
        "method": {
            "name": outlook.choice.name,
            "why": outlook.choice.why,
            "others": dict(outlook.choice.others),
        },
        "bounds": [
            {"kind": b.kind, "value_s": b.value_s, "witness": dict(b.witness), "sentence": b.sentence}
            for b in outlook.bounds
        ],
        "tie": outlook.tie,
        "what_would_help": [
            {
                "lever": lever.kind,
                "what": lever.what,
                "lower_bound_s": lever.value_s,
                "gain_s": lever.gain_s,
                "sentence": lever.sentence,
            }
            for lever in outlook.levers
        ],
        "machines": [
            {"machine": machine.id, "count": machine.count, "load_s": load}
            for machine, load in zip(shop.machines, shop.machine_load_s.tolist(), strict=True)
        ],
        "orders": [
            {"order": name, "load_s": load}
            for name, load in zip(shop.orders.ids, shop.job_load_s.tolist(), strict=True)
        ],
    }
