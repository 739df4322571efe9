"""``shopfloor replan``: a new plan of what is left of a shift, moving little."""

from __future__ import annotations

import time
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from shopfloor.cli import common
from shopfloor.cli.files import write_plan
from shopfloor.cli.handover import ShiftEndOption, ShiftStartOption
from shopfloor.settings import SETTINGS

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from shopfloor.journal.events import Journal
    from shopfloor.model.actuals import Event, ShiftState
    from shopfloor.model.results import Fault
    from shopfloor.read.orders import Reading
    from shopfloor.replan.movement import Moves
    from shopfloor.rolling.plan import Replan

TIME_LIMIT: Any = SETTINGS["time-limit"].default
WORKERS: Any = SETTINGS["workers"].default
SEED: Any = SETTINGS["seed"].default
OUTAGE, LEAST = 30.0, 1.0  # minutes


def replan(
    journal: Annotated[Path, typer.Argument(metavar="JOURNAL", help="The shift's journal.")],
    orders: Annotated[
        str, typer.Argument(metavar="ORDERS", help="The orders that the shift's first plan was made from.")
    ],
    shop: common.ShopOption = None,
    now: Annotated[
        str | None, typer.Option("--now", metavar="TIME", help="The moment to plan from; now without it.")
    ] = None,
    back: Annotated[
        list[str] | None,
        typer.Option(
            "--back", metavar="MACHINE=TIME", help="When a machine that is down is back; repeatable."
        ),
    ] = None,
    outage: Annotated[
        float,
        typer.Option(
            "--outage",
            metavar="MINUTES",
            help="How long what is down stays so where --back says nothing.",
            min=1,
        ),
    ] = OUTAGE,
    least: Annotated[
        float,
        typer.Option(
            "--least", metavar="MINUTES", help="Least time that running work is taken to need still.", min=0
        ),
    ] = LEAST,
    stability: Annotated[
        float,
        typer.Option(
            "--stability", metavar="MINUTES", help="The plan may end so much later if that moves less.", min=0
        ),
    ] = 0,
    issue: Annotated[
        bool, typer.Option("--issue", help="Record in the journal that the new plan is in force.")
    ] = False,
    who: Annotated[
        str,
        typer.Option(
            "--who", metavar="NAME", envvar="SHOPFLOOR_WHO", help="Who issues it.", show_default=False
        ),
    ] = "",
    out: Annotated[
        Path | None,
        typer.Option("--out", metavar="DIR", help="Folder for the files; without it none is written."),
    ] = None,
    start: ShiftStartOption = None,
    end: ShiftEndOption = None,
    round_minutes: common.RoundOption = None,
    crew: common.CrewOption = None,
    split: common.SplitOption = False,
    objective: Annotated[
        str | None,
        typer.Option(
            "--objective",
            metavar="GOALS",
            help="What counts first, and what then; as in the plan in force without it.",
        ),
    ] = None,
    time_limit: Annotated[float, common.setting("time-limit", metavar="SECONDS", least=0)] = TIME_LIMIT,
    workers: Annotated[int, common.setting("workers", metavar="N", least=0)] = WORKERS,
    seed: Annotated[int, common.setting("seed", metavar="N")] = SEED,
    stamp: Annotated[str | None, common.setting("stamp", metavar="TEXT")] = None,
    codes: Annotated[
        str | None, typer.Option("--codes", metavar="KIND", help="Print qr or code128 codes on the sheets.")
    ] = None,
    xlsx: Annotated[bool, typer.Option("--xlsx/--no-xlsx", help="Write plan.xlsx too.")] = True,
    as_json: common.JsonOption = False,
    quiet: common.QuietOption = False,
) -> None:
    """Plan what is left of a shift anew: finished and running work stays, the rest moves as little as it can.

    The best finish and lateness come first; among plans equally good the one that moves least wins. The
    plan is audited against what is left and against the journal, names the plan it follows, and says what
    moved. A machine of several units is named MACHINE:UNIT for --back.

    Exit code 0: done. 1: the plan overruns the shift. 2: bad input. 3: no plan in the time given.
    """
    from shopfloor import pipeline
    from shopfloor.cli.handover import moment, open_to_read, read_shift
    from shopfloor.cli.progress import Reporter, stopping
    from shopfloor.errors import InputError
    from shopfloor.journal.state import state
    from shopfloor.rolling.plan import replan as plan_anew

    common.one_of("--codes", codes, ("qr", "code128"))
    if issue:
        _see_that_it_can_be_issued(journal)
    with open_to_read(journal) as opened:
        events, clock = opened.events(), opened.clock
        now_s = moment(opened, events, now, as_json, field="now")
        try:
            reading = read_shift(opened, orders, shop, start, end, round_minutes, crew=crew, split=split)
            expected = _back(opened, state(events, now_s), now_s, back or ())
        except InputError as error:
            common.refuse(error, as_json)
    common.see_that_it_can_be_written(out)
    notices = (*reading.notices, *_strange_crews(reading, state(events, now_s)))
    common.print_notices(notices, quiet or as_json)
    report = Reporter(clock, quiet)
    began = time.perf_counter()
    with stopping() as stop:
        found = plan_anew(
            reading.shop,
            events,
            now_s,
            options=pipeline.Options(
                time_limit_s=time_limit,
                workers=workers,
                seed=seed,
                objective=_goals(objective, events, now_s),
            ),
            stability_s=round(stability * 60),
            back=expected,
            outage_s=round(outage * 60),
            minimum_left_s=round(least * 60),
            inputs=reading.inputs,
            report=report,
            stop=stop,
        )
    report.close()
    solve_s = time.perf_counter() - began
    files = (
        []
        if out is None
        else write_plan(found.plan, out, stamp=stamp, codes=codes, xlsx=xlsx, moved=found.comparison)
    )
    entry = _issue(journal, found, now_s, who) if issue else None
    if as_json:
        data = {**_data(found, files, solve_s), "issued": entry}
        common.print_json({**data, "notices": [common.fault_data(notice) for notice in notices]})
    elif not quiet:
        print("\n".join(_lines(found, state(events, now_s), files, entry)))
    raise typer.Exit(common.NO if found.plan.fits_shift is False else common.DONE)


# ---- options ---------------------------------------------------------------------------------------


def _back(
    journal: Journal, state: ShiftState, now_s: int, given: Sequence[str]
) -> dict[tuple[str, int], int]:
    """Read MACHINE=TIME and MACHINE:UNIT=TIME; every fault is raised together."""
    from shopfloor.errors import InputError
    from shopfloor.journal.errors import EntryError
    from shopfloor.journal.moments import read
    from shopfloor.model.results import Fault

    found: dict[tuple[str, int], int] = {}
    faults = []

    def fault(text: str, rule: str, problem: str, advice: str) -> None:
        faults.append(Fault("--back", 0, "", text[:40], rule, problem, advice))

    for text in given:
        name, equals, when = text.rpartition("=")
        machine, unit = _unit(name.strip(), state)
        known = state.machines.get(machine)
        if not equals or not machine:
            fault(
                text,
                "back-unreadable",
                "is no MACHINE=TIME",
                "write CMM=08:00, or CMM:2=08:00 for its unit 2",
            )
        elif known is None or known.outage(unit) is None:
            down = sorted(
                each.id for each in state.machines.values() if any(o.end_s is None for o in each.outages)
            )
            named = f"down are: {', '.join(down)}" if down else "none is"
            fault(
                text, "back-not-down", f"names nothing that is down; {named}", "record that it is down first"
            )
        else:
            try:
                until = read(journal.clock, when, now_s, field="back")
            except EntryError as error:
                fault(text, error.rule, error.problem, error.advice)
                continue
            if until <= now_s:
                advice = "record that it is up, or give a later time"
                fault(text, "back-past", f"is not after {journal.clock.say(now_s)}", advice)
            found[machine, unit] = until
    if faults:
        raise InputError(faults)
    return found


def _unit(name: str, state: ShiftState) -> tuple[str, int]:
    """Take MACHINE:UNIT apart, unless that is the name of a machine; unit 0 is all of it."""
    machine, colon, number = name.rpartition(":")
    if name in state.machines or not colon or not (number.isdecimal() and len(number) < 6):
        return name, 0
    return machine, int(number)


def _strange_crews(reading: Reading, state: ShiftState) -> list[Fault]:
    """Return a notice for each crew that the journal counts and the shop has not."""
    from shopfloor.model.results import Fault

    known = sorted(crew.id for crew in reading.shop.crews)
    named = f", which has {', '.join(known)}" if known else ""
    problem = f"names no crew of the shop{named}; it is left out"
    return [
        Fault(
            "log crew --pool", 0, "", name[:40], "crew-unknown", problem, "undo it, and name one of its crews"
        )
        for name in sorted(state.crew)
        if name and name not in known
    ]


def _goals(given: str | None, events: Sequence[Event], now_s: int) -> tuple[str, ...]:
    """Return what counts: as asked, else as in the plan in force."""
    from shopfloor.model.actuals import Kind
    from shopfloor.pipeline import Options

    known = ("makespan", "tardiness", "changeovers")
    if given is not None:
        goals = tuple(goal.strip() for goal in given.split(","))
        for goal in goals:
            common.one_of("--objective", goal, known)
        if len(set(goals)) < len(goals):
            raise typer.BadParameter("names a goal twice", param_hint="--objective")
        return goals
    plans = [event for event in events if event.kind is Kind.ISSUED and event.at_s <= now_s]
    head: Any = plans[-1].data.get("head") if plans else {}
    options = head.get("options") if isinstance(head, dict) else None
    listed = options.get("objective") if isinstance(options, dict) else None
    if isinstance(listed, list) and listed and all(goal in known for goal in listed):
        return tuple(dict.fromkeys(listed))
    return Options().objective


# ---- the journal -----------------------------------------------------------------------------------


def _see_that_it_can_be_issued(path: Path) -> None:
    """Open the journal to write before the search begins: nobody waits for a plan that cannot be issued."""
    from shopfloor.journal.events import Journal

    with Journal.open(path) as opened:
        opened.ready()


def _issue(path: Path, found: Replan, now_s: int, who: str) -> int:
    """Record that the plan is in force, and return the number of the entry."""
    import hashlib
    import json

    from shopfloor.cli.log_common import recorder
    from shopfloor.journal.events import Journal
    from shopfloor.journal.pieces import issued_plan
    from shopfloor.model.stated import state
    from shopfloor.render.tables import plan_json

    text = plan_json(found.plan)
    digest = hashlib.sha256(text.encode("utf-8")).hexdigest()
    plan = issued_plan(state(found.plan), json.loads(text), sha256=digest, numbers=found.numbers)
    with Journal.open(path) as opened:
        return opened.issue(plan, recorder(opened.clock), at_s=now_s, who=who).event.seq


# ---- printing --------------------------------------------------------------------------------------


def _lines(found: Replan, state: ShiftState, files: list[Path], entry: int | None) -> list[str]:
    from shopfloor.model.actuals import Status
    from shopfloor.model.clock import duration
    from shopfloor.render import compare_text, text
    from shopfloor.replan.movement import MOVED_S

    made, rest = found.plan, found.rest
    say = made.shop.clock.say
    running, waiting = len(rest.look.running), sum(not one.running for one in rest.left)
    done = len(state.of(Status.DONE))
    counts = f"done {done:,}, running {running:,}, waiting {waiting:,}"
    lines = [text.wrap(f"At {say(rest.now_s)}: operations {counts}.")]
    if rest.look.running:
        ends = ", ".join(
            f"{text.cut(made.shop.machines[one.machine].id, 14)} {say(one.ends_s)}"
            for one in sorted(rest.look.running, key=lambda one: (one.ends_s, one.machine, one.unit))
        )
        lines.append(text.wrap(f"Running work is expected to be done: {ends}."))
    lines += ["", *text.plan_lines(made)]
    a = found.comparison.a
    if not found.comparison.identical:
        slight = duration(MOVED_S)
        against = f"Against {text.cut(a.name, 24)} {a.sha256[:8]} (A); up to {slight} is no move:"
        lines += ["", text.wrap(against)]
        lines += compare_text.moves_lines(found.comparison, say)
    if files:
        lines += ["", text.wrap(f"Wrote {', '.join(str(path) for path in files)}.")]
    if entry is not None:
        lines += ["", f"Recorded as No {entry}: this plan is in force from {say(rest.now_s)}."]
    return [*lines, "", text.wrap(text.CARE)]


def _data(found: Replan, files: list[Path], solve_s: float) -> dict[str, Any]:
    from shopfloor.render.compare_text import compare_data
    from shopfloor.render.tables import summary

    compared = compare_data(found.comparison)
    return {
        **summary(found.plan),
        "now_s": found.rest.now_s,
        "begin_s": found.rest.begin_s,
        "parent": found.comparison.a.sha256,
        "moves": _moves_data(found.moves),
        "scratch": None if found.scratch is None else _moves_data(found.scratch),
        "trades": [
            {"worse_s": dict(one.worse_s), "stability_s": one.stability_s, **_moves_data(one.moves)}
            for one in found.trades
        ],
        "compare": {
            name: compared[name] for name in ("counts", "resequenced", "machines", "orders", "changes")
        },
        "files": [str(path) for path in files],
        "solve_s": round(solve_s, 3),
    }


def _moves_data(moves: Moves) -> Mapping[str, int]:
    return {"moved": moves.moved, "resequenced": moves.resequenced, "weight": moves.weight}
