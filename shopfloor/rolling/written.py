"""A candidate as a plan: its bounds, why it was chosen, which plan it follows, the names of its rows."""

from __future__ import annotations

from collections.abc import Mapping
from itertools import count
from typing import Any

from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.bounds.levers import tie_sentence, what_would_help
from shopfloor.model.actuals import ShiftState
from shopfloor.model.results import Bound, Choice, Plan
from shopfloor.model.schedule import Schedule
from shopfloor.pipeline import HELP_UP_TO
from shopfloor.replan.residual import Residual
from shopfloor.replan.told import Told
from shopfloor.rolling.archive import Candidate
from shopfloor.rolling.bench import Bench


def written(
    rest: Residual,
    bench: Bench,
    chosen: Candidate,
    fresh: Plan | None,
    *,
    inputs: tuple[tuple[str, str], ...],
    options: Mapping[str, Any],
    repeatable: bool,
    stopped: str,
) -> Plan:
    """Return a candidate as a plan of what is left, with bounds, the reason for it, and what would help."""
    shop = rest.shop
    schedule = bench.schedules(chosen.timed)[1]
    bounds = _bounds(rest, schedule, fresh)
    helps: tuple[str, ...] = ()
    if len(shop) <= HELP_UP_TO:
        tie = tie_sentence(shop, bounds)
        levers = (lever.sentence for lever in what_would_help(shop, bounds))
        helps = (*([tie] if tie else []), *levers)
    return Plan(
        shop=shop,
        schedule=schedule,
        bounds=bounds,
        choice=_choice(chosen, fresh),
        inputs=inputs,
        options=options,
        remarks=rest.remarks,
        would_help=helps,
        stopped=stopped,
        repeatable=repeatable,
    )


def _bounds(rest: Residual, schedule: Schedule, fresh: Plan | None) -> tuple[Bound, ...]:
    """Return the bounds of the rest; what a solver proved of it counts where it was asked the same."""
    bounds = lower_bounds(rest.shop)
    for bound in fresh.bounds if fresh is not None and rest.exact else ():
        value = bound.value_s + rest.begin_s
        if bound.kind == "solver" and value > (bounds[0].value_s if bounds else 0):
            finish = rest.shop.clock.say(value)
            sentence = f"The solver CP-SAT has proved that nothing can end before {finish}."
            if value <= schedule.makespan_s:
                bounds = (Bound("solver", value, bound.witness, sentence), *bounds)
    return bounds


def _choice(chosen: Candidate, fresh: Plan | None) -> Choice:
    others = {} if fresh is None else dict(fresh.choice.others)
    match chosen.origin:
        case "kept":
            why = (
                "every machine goes on in its old sequence as early as it can, and nothing found ends earlier"
            )
            return Choice("kept sequence", why, others)
        case "mended":
            why = (
                "the old rounds were mended along paths of two rounds each, in the fewest rounds that can "
                "hold what is left (König 1916)"
            )
            return Choice("mended rounds", why, others)
        case "repaired":
            why = (
                "whatever can runs where it was planned, and the rest finds gaps, as far as finish and "
                "lateness allow"
            )
            return Choice("repaired sequence", why, others)
        case _:
            assert fresh is not None
            return Choice(fresh.choice.name, f"planned anew: {fresh.choice.why}", others)


def parent(said: Told) -> tuple[tuple[str, str], ...]:
    """Return name and hash of the plan in force."""
    if not said.plans:
        return ()
    data = said.plans[-1].data
    return ((f"parent {data.get('name', 'plan.json')}", str(data.get("sha256", ""))),)


def numbers(rest: Residual, made: Plan, here: ShiftState) -> list[int]:
    """Return the number of each assignment: its operation's own, and free ones for further parts."""
    taken = {*here.pieces, *(one.key for one in rest.left)}
    found = []
    for row in made.schedule:
        key = rest.left[row.operation].key
        if row.part > 1:
            key = next(key for n in count(1) if (key := key._replace(piece=n)) not in taken)
            taken.add(key)
        found.append(key.piece)
    return found


def begun_early(said: Told, here: ShiftState, now_s: int) -> list[list[Any]]:
    """Return order, machine and planned start of what the last plan has from now on, and is begun already."""
    rows = said.plans[-1].pieces if said.plans else ()
    return [
        [row.key.order, row.key.machine, row.start_s]
        for row in rows
        if row.start_s is not None
        and row.start_s >= now_s
        and row.key in here.pieces
        and here.pieces[row.key].touched
    ]
