"""``shopfloor handover``: how the shift went, and what the next one gets."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from shopfloor.cli import common

if TYPE_CHECKING:
    from collections.abc import Sequence

    from shopfloor.journal.events import Journal
    from shopfloor.model.actuals import Event
    from shopfloor.model.clock import Clock
    from shopfloor.model.results import Fault
    from shopfloor.read.orders import Reading
    from shopfloor.replan.handover import Handover


ShiftStartOption = Annotated[
    str | None, typer.Option("--start", metavar="TIME", help="Start of the shift; the journal's without it.")
]
ShiftEndOption = Annotated[
    str | None, typer.Option("--end", metavar="TIME", help="End of the shift; the journal's without it.")
]


def handover(
    journal: Annotated[Path, typer.Argument(metavar="JOURNAL", help="The shift's journal.")],
    orders: Annotated[
        str | None,
        typer.Argument(metavar="ORDERS", help="The orders its first plan was made from.", show_default=False),
    ] = None,
    shop: common.ShopOption = None,
    at: Annotated[
        str | None,
        typer.Option(
            "--at", metavar="TIME", help="As it stood then; now, or the end of the shift, without it."
        ),
    ] = None,
    out: Annotated[
        Path | None,
        typer.Option(
            "--out", metavar="DIR", help="Folder for the page and the tables; without it none is written."
        ),
    ] = None,
    start: ShiftStartOption = None,
    end: ShiftEndOption = None,
    round_minutes: common.RoundOption = None,
    crew: common.CrewOption = None,
    split: common.SplitOption = False,
    stamp: Annotated[str | None, common.setting("stamp", metavar="TEXT")] = None,
    as_json: common.JsonOption = False,
    quiet: common.QuietOption = False,
) -> None:
    """Tell how the shift went: planned and actual by machine and order, sequence, scrap, what carries over.

    With --out: handover.html, machines.csv, order-reports.csv and carry-over.csv, which `plan` reads next
    shift. Without ORDERS it knows neither due times, set-ups nor closures, and writes no carry-over.csv.

    Exit code 0: done. 2: bad input.
    """
    from shopfloor.errors import InputError
    from shopfloor.render import handover_text
    from shopfloor.render.text import CARE, wrap
    from shopfloor.replan import figures

    with open_to_read(journal) as opened:
        clock, end_s = opened.clock, opened.shift_end_s
        events = opened.events()
        at_s = moment(opened, events, at, as_json)
        try:
            reading = (
                None
                if orders is None
                else read_shift(opened, orders, shop, start, end, round_minutes, crew=crew, split=split)
            )
        except InputError as error:
            common.refuse(error, as_json)
    found = _found(events, at_s, reading, clock, end_s)
    files = _write(found, reading, clock, out, stamp) if out is not None else []
    notices = reading.notices if reading is not None else ()
    if as_json:
        data = handover_text.handover_data(found, figures)
        listed = [common.fault_data(notice) for notice in notices]
        common.print_json({**data, "files": [str(path) for path in files], "notices": listed})
    elif not quiet:
        common.print_notices(notices, quiet)
        print("\n".join(handover_text.handover_lines(found, clock, figures)))
        if reading is None:
            said = "due times, set-ups and closures are not known, and nothing can be carried over"
            print("\n" + wrap(f"Without ORDERS {said}: give the orders file of the plan."))
        if files:
            print("\n" + wrap(f"Wrote {', '.join(str(path) for path in files)}."))
        print("\n" + wrap(CARE))


def _found(
    events: Sequence[Event], at_s: int, reading: Reading | None, clock: Clock, end_s: int | None
) -> Handover:
    from shopfloor.journal.state import counting, state
    from shopfloor.replan.current import current
    from shopfloor.replan.handover import handover as hand_over
    from shopfloor.replan.known import known_shop
    from shopfloor.replan.told import told

    now, said = state(events, at_s), told(counting(events), at_s)
    shop = reading.shop if reading is not None else known_shop(now, said, clock, end_s)
    return hand_over(current(shop, now, said), now, said)


def _write(
    found: Handover, reading: Reading | None, clock: Clock, out: Path, stamp: str | None
) -> list[Path]:
    from shopfloor.render import handover_csv
    from shopfloor.render.handover_page import handover_page
    from shopfloor.render.save import save
    from shopfloor.replan import figures
    from shopfloor.replan.carry import carry_shop

    files: dict[str, bytes | str] = {
        "handover.html": handover_page(found, clock, figures, stamp=stamp),
        "machines.csv": handover_csv.machines_csv(found, figures),
        "order-reports.csv": handover_csv.order_reports_csv(found, clock),
    }
    if reading is not None:
        set_up = bool(reading.shop.operations.setup_s.any())
        files["carry-over.csv"] = handover_csv.carry_csv(
            carry_shop(found.now, found.left, found.at_s), set_up=set_up
        )
    return save(out, files)


# ---- what handover and replan share ------------------------------------------------------------------


def open_to_read(path: Path) -> Journal:
    """Open a journal without writing to it, and see that it is sound."""
    from shopfloor.journal.events import Journal

    opened = Journal.open(path, write=False)
    opened.check()
    return opened


def moment(
    journal: Journal, events: Sequence[Event], text: str | None, as_json: bool, *, field: str = "at"
) -> int:
    """Return the moment asked for by the option `field`: as said, or now but not long after the shift."""
    from shopfloor.cli import log_common
    from shopfloor.journal.errors import EntryError
    from shopfloor.journal.moments import read
    from shopfloor.model.actuals import Kind

    now = log_common.recorder(journal.clock).now_s
    if text is not None:
        try:
            return max(0, read(journal.clock, text, now, field=field))
        except EntryError as error:
            log_common.refuse_value(error, as_json)
    last = max((event.at_s for event in events if event.kind is not Kind.WITHDRAWN), default=0)
    end = journal.shift_end_s if journal.shift_end_s is not None else last
    return last if now is None else min(max(now, 0), max(last, end))


def read_shift(
    journal: Journal,
    orders: str,
    shop: Path | None,
    start: str | None,
    end: str | None,
    round_minutes: float | None,
    *,
    crew: int | None = None,
    split: bool = False,
) -> Reading:
    """Read the orders of a journal's first plan, on the journal's clock unless another start is given.

    Raises
    ------
    InputError
        With every fault of the files, or if they are for another shift. Other bytes than the plan was made
        from are a notice only: a file saved anew may say the same.
    """
    from dataclasses import replace

    from shopfloor.errors import InputError
    from shopfloor.model.results import Fault

    clock, end_s = journal.clock, journal.shift_end_s
    if clock.start is not None and start is None:
        start = clock.start.isoformat(timespec="seconds")
    if end is None and end_s is not None:
        end = clock.write(end_s)
    reading = common.read(orders, shop, start, end, round_minutes, crew=crew, split=split)
    if reading.shop.clock != clock:
        wanted = f"{clock.write(0)}{f' {clock.zone}' if clock.zone else ''}" if clock.running else "no time"
        raise InputError(
            [
                Fault(
                    reading.inputs[0][0],
                    0,
                    "",
                    "",
                    "other-shift",
                    f"is read for another shift than the journal's, which starts at {wanted}",
                    "give the shop.toml and the start that its plan was made with",
                )
            ]
        )
    return replace(reading, notices=(*reading.notices, *_other_bytes(journal, reading)))


def _other_bytes(journal: Journal, reading: Reading) -> list[Fault]:
    """Return a notice for each file that is not the one the journal's first plan was made from."""
    from shopfloor.model.actuals import Kind
    from shopfloor.model.results import Fault

    first = next((event for event in journal.events() if event.kind is Kind.ISSUED), None)
    head: Any = first.data.get("head", {}) if first is not None else {}
    listed = head.get("inputs") if isinstance(head, dict) else None
    known = (
        {row.get("sha256") for row in listed if isinstance(row, dict)} if isinstance(listed, list) else set()
    )
    return [
        Fault(
            name,
            0,
            "",
            "",
            "other-input",
            "is not, byte for byte, what the shift's first plan was made from",
            "check that it says the same",
        )
        for name, digest in reading.inputs
        if known and digest not in known
    ]
