"""``shopfloor compare``: what moved between two plans."""

from __future__ import annotations

import json
from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from shopfloor.cli import common

if TYPE_CHECKING:
    from shopfloor.errors import InputError
    from shopfloor.model.clock import Clock
    from shopfloor.model.results import Lateness
    from shopfloor.replan.compare import Side


def compare(
    a: Annotated[Path, typer.Argument(metavar="A", help="plan.json before.")],
    b: Annotated[Path, typer.Argument(metavar="B", help="plan.json after.")],
    page: Annotated[
        Path | None, typer.Option("--page", metavar="FILE", help="Write it as a page to this file, too.")
    ] = None,
    tolerance: Annotated[
        float,
        typer.Option("--tolerance", metavar="MINUTES", help="A smaller shift counts as none.", min=0),
    ] = 0,
    as_json: common.JsonOption = False,
    quiet: common.QuietOption = False,
) -> None:
    """Show what moved between two plans: operations, machines, orders, finish, bound and lateness.

    Exit code 0: done, whatever differs. 2: bad input.
    """
    from shopfloor.errors import InputError
    from shopfloor.render import compare_text
    from shopfloor.render.save import save_file
    from shopfloor.render.text import CARE, wrap
    from shopfloor.replan.compare import compare as compare_plans

    try:
        before, clock = load_side(a)
        after, other = load_side(b)
        after = _on_clock(after, other, clock)
    except InputError as error:
        common.refuse(error, as_json)
    found = compare_plans(before, after, tolerance_s=round(tolerance * 60))
    if page is not None:
        from shopfloor.render.compare_page import compare_page

        save_file(page, compare_page(found, clock))
    if as_json:
        common.print_json({**compare_text.compare_data(found), "page": str(page) if page else None})
    elif not quiet:
        print("\n".join(compare_text.compare_lines(found, clock.say)))
        if page is not None:
            print("\n" + wrap(f"Wrote {page}."))
        print("\n" + wrap(CARE))


def load_side(path: Path) -> tuple[Side, Clock]:
    """Read plan.json as one side of a comparison, on its own clock.

    Raises
    ------
    InputError
        With every fault of the file; plan.csv is refused, since it says neither bound nor due times.
    """
    from shopfloor.journal.pieces import clock_of
    from shopfloor.model.clock import Clock
    from shopfloor.read.plan import MAX_PLAN_BYTES
    from shopfloor.read.plan_json import is_json, read_plan_json
    from shopfloor.read.rules import Findings
    from shopfloor.read.source import take
    from shopfloor.replan.compare import Row, Side

    taken = take(path, limit=MAX_PLAN_BYTES)
    if not is_json(taken):
        raise _fault(
            taken.name,
            "plan-no-json",
            "is no plan.json, and only that says bound and lateness",
            "give the plan.json that stands beside it",
        )
    head: Any = {}
    clock = Clock()
    try:
        head = json.loads(taken.data)
        clock = clock_of(head)
    except ValueError as error:
        if head:
            raise _fault(taken.name, "plan-clock", f"has no clock: {error}", "make the plan anew") from None
    except (AttributeError, RecursionError):
        head = {}  # the reader says what is wrong
    stated = read_plan_json(taken, clock, Findings())
    columns = (stated.unit, stated.start_s, stated.end_s, stated.round)
    rows = [
        Row(order, machine, unit, start, end, None if rank < 0 else rank)
        for order, machine, unit, start, end, rank in zip(
            stated.order, stated.machine, *(column.tolist() for column in columns), strict=True
        )
    ]
    end = max((row.end_s for row in rows), default=0)
    side = Side(
        name=taken.name,
        sha256=taken.sha256,
        rows=rows,
        makespan_s=end if stated.makespan_s is None else stated.makespan_s,
        bound_s=stated.lower_bound_s or 0,
        proved=bool(stated.proved_optimal),
        fits=stated.fits_shift,
        late=tuple(_late(taken.name, head)),
        method=_method(head),
        from_s=_from(head),
        begun=_begun(head),
    )
    return side, clock


def _fault(file: str, rule: str, problem: str, advice: str, column: str = "") -> InputError:
    from shopfloor.errors import InputError
    from shopfloor.model.results import Fault

    return InputError([Fault(file, 0, column, "", rule, problem, advice)])


def _late(file: str, head: Mapping[str, Any]) -> list[Lateness]:
    from shopfloor.model.results import Lateness

    listed = head.get("late", [])
    sound = isinstance(listed, list) and all(
        isinstance(row, dict)
        and isinstance(row.get("order"), str)
        and type(row.get("due_s")) is int
        and type(row.get("finish_s")) is int
        for row in listed
    )
    if not sound:
        raise _fault(
            file, "late-unreadable", "holds something else than late orders", "make the plan anew", "late"
        )
    return [Lateness(row["order"], row["due_s"], row["finish_s"]) for row in listed]


def _method(head: Mapping[str, Any]) -> str:
    method = head.get("method")
    name = method.get("name") if isinstance(method, dict) else None
    return name if isinstance(name, str) else ""


def _from(head: Mapping[str, Any]) -> int | None:
    """Return the moment from which a plan made during the shift goes."""
    options = head.get("options")
    value = options.get("now_s") if isinstance(options, dict) else None
    return value if type(value) is int else None


def _begun(head: Mapping[str, Any]) -> frozenset[tuple[str, str, int]]:
    """Return which rows of its parent a plan made during the shift found begun already."""
    options = head.get("options")
    listed = options.get("begun") if isinstance(options, dict) else None
    kinds = (str, str, int)
    return frozenset(
        (row[0], row[1], row[2])
        for row in (listed if isinstance(listed, list) else ())
        if isinstance(row, list) and tuple(map(type, row)) == kinds
    )


def _on_clock(side: Side, own: Clock, other: Clock) -> Side:
    """Return `side` with its times counted from the start of the other plan's shift."""
    from dataclasses import replace

    if own.running != other.running:
        problem = "has a start of the shift, and the other plan has none"
        if not own.running:
            problem = "has no start of the shift, and the other plan has one"
        raise _fault(side.name, "plan-other-clock", problem, "give --start when making both plans")
    if own.start is None or own.zone != other.zone:
        if own.zone != other.zone:
            raise _fault(
                side.name, "plan-other-zone", "is for another time zone", "compare plans of one hall"
            )
        return side
    offset = other.seconds(own.start)
    if not offset:
        return side
    return replace(
        side,
        rows=[row._replace(start_s=row.start_s + offset, end_s=row.end_s + offset) for row in side.rows],
        makespan_s=side.makespan_s + offset,
        bound_s=side.bound_s + offset,
        late=tuple(
            replace(row, due_s=row.due_s + offset, finish_s=row.finish_s + offset) for row in side.late
        ),
        from_s=None if side.from_s is None else side.from_s + offset,
        begun=frozenset((order, machine, start + offset) for order, machine, start in side.begun),
    )
