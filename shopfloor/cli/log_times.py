"""``shopfloor log times``: what the floor teaches about run times."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from shopfloor.cli import common
from shopfloor.cli import log_common as shared

if TYPE_CHECKING:
    from collections.abc import Callable

    from shopfloor.journal.times import Family, Worked


def times(
    journals: Annotated[list[Path], typer.Argument(metavar="JOURNAL", help="One or many journals.")],
    orders: Annotated[
        list[str] | None,
        typer.Option("--orders", metavar="FILE", help="The orders planned: gives families; repeatable."),
    ] = None,
    shop: common.ShopOption = None,
    out: Annotated[
        Path | None, typer.Option("--csv", metavar="FILE", help="Write suggested minutes to this file.")
    ] = None,
    as_json: common.JsonOption = False,
    quiet: common.QuietOption = False,
) -> None:
    """Compare planned and actual minutes by machine, and by family with --orders. Nothing is applied.

    With --orders and --shop, breaks over which a machine pauses are left out of both.

    Exit code 0: done. 2: bad input.
    """
    from dataclasses import asdict

    from shopfloor.errors import InputError
    from shopfloor.journal.times import learned, timings
    from shopfloor.render import log_text
    from shopfloor.render.save import save_file
    from shopfloor.render.tables import harmless

    try:
        family, worked = _knowledge(orders or [], shop)
    except InputError as error:
        common.refuse(error, as_json)
    found = []
    for path in journals:
        with shared.open_journal(path, write=False) as opened:
            opened.check()
            found += timings(opened.events(), family=family, worked=worked)
    rows = learned(found)
    if out is not None:
        save_file(out, log_text.times_csv(rows, harmless))
    if as_json:
        common.print_json(
            {"ok": True, "times": [asdict(row) for row in rows], "file": str(out) if out else None}
        )
    elif not quiet:
        print("\n".join(log_text.times_lines(rows)))
        if out is not None:
            print(f"Wrote {out}.")


def _knowledge(orders: list[str], shop: Path | None) -> tuple[Family, Worked]:
    """Return what the orders files and shop.toml tell of families and working time."""
    families: dict[tuple[str, str], str] = {}
    clocks: dict[str, Callable[[int], int]] = {}
    for name in orders:
        hall = common.read(name, shop, None, None, None).shop
        for row in hall:
            families.setdefault((row.order, row.machine_id), row.family)
        clocks |= _clocks(hall)

    def worked(machine: str, start: int, end: int) -> int:
        count = clocks.get(machine)
        return end - start if count is None else count(end) - count(start)

    return lambda order, machine: families.get((order, machine), ""), worked


def _clocks(hall: Any) -> dict[str, Callable[[int], int]]:
    """Return the working time before a moment, for each machine that pauses over breaks and closures."""
    from shopfloor.model.calendar import WorkClock

    found: dict[str, Callable[[int], int]] = {}
    for machine in hall.machines:
        if machine.pauses:
            shut: list[list[int]] = []
            for one in sorted((*hall.breaks, *machine.closed), key=lambda pause: pause.start_s):
                if shut and one.start_s <= shut[-1][1]:
                    shut[-1][1] = max(shut[-1][1], one.end_s)
                else:
                    shut.append([one.start_s, one.end_s])
            clock = WorkClock((start, end) for start, end in shut)
            found[machine.id] = lambda moment, clock=clock: int(clock.worked(moment))  # type: ignore[misc]
    return found
