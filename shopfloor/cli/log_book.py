"""The subcommands of ``shopfloor log`` that deal with whole files: open, import, scan, show."""

from __future__ import annotations

import json
import sys
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from shopfloor.cli import common
from shopfloor.cli import log_common as shared

if TYPE_CHECKING:
    from shopfloor.journal.events import Journal
    from shopfloor.journal.pieces import IssuedPlan
    from shopfloor.journal.rows import Rows
    from shopfloor.model.results import Fault

SHOWN = 10


def open_plan(
    plan: Annotated[str, typer.Argument(metavar="PLAN", help="plan.json, or - for standard input.")],
    journal: shared.JournalOption = None,
    again: Annotated[
        bool, typer.Option("--again", help="Issue another plan in a journal that has one.")
    ] = False,
    at: Annotated[
        str | None,
        typer.Option("--at", metavar="TIME", help="When another plan takes force; now without it."),
    ] = None,
    who: shared.WhoOption = "",
    as_json: common.JsonOption = False,
    quiet: common.QuietOption = False,
) -> None:
    """Make the journal of a shift: PLAN is issued. The same plan once more changes nothing.

    The first plan is in force from the start of the shift.

    Exit code 0: done. 1: the journal has another plan and --again was not said, or the time cannot be.
    2: bad input.
    """
    from shopfloor.errors import InputError
    from shopfloor.journal.errors import EntryError, RefusedError
    from shopfloor.journal.events import Journal, Recorded

    path = shared.journal_path(journal)
    try:
        if not path.exists():
            issued = _issued(plan)
            made = Journal.create(path, issued, shared.recorder(issued.clock), who=who)
            done, opened = Recorded(made.plan()), made
        else:
            opened = Journal.open(path)
            done = _again(opened, plan, again=again, at=at, who=who, as_json=as_json)
    except InputError as error:
        shared.refuse_file(error, as_json)
    except EntryError as error:
        shared.refuse_value(error, as_json)
    except RefusedError as error:
        shared.refuse_entry(error, as_json)
    with opened:
        shared.print_recorded([done], opened, as_json=as_json, quiet=quiet)


def _again(journal: Journal, plan: str, *, again: bool, at: str | None, who: str, as_json: bool) -> Any:
    from dataclasses import replace

    from shopfloor.journal.errors import Refusal, RefusedError
    from shopfloor.journal.events import Recorded
    from shopfloor.journal.moments import read

    issued, force = _issued(plan, journal), journal.plan()
    if force.data["sha256"] == issued.sha256:
        return Recorded(force, repeat=True)
    in_force = f"{force.data['name']} {force.data['sha256'][:8]}"
    if not again:
        problem = f"{journal.path} has another plan in force, {in_force}"
        advice = "choose another file for a new shift, or add --again to issue this plan in the same shift"
        shared.refuse_entry(RefusedError([Refusal(0, "other-plan", problem, advice, final=True)]), as_json)
    by = shared.recorder(journal.clock)
    at_s = None if at is None else read(journal.clock, at, by.now_s)
    done = journal.issue(issued, by, at_s=at_s, who=who)
    parent = issued.parent
    if parent and parent != force.data["sha256"]:
        note = f"it was made to follow the plan {parent[:8]}, not {in_force}, which was in force until now"
        return replace(done, notes=(*done.notes, f"{note}; compare the two, or replan"))
    return done


def _issued(plan: str, journal: Journal | None = None) -> IssuedPlan:
    """Read plan.json, to be issued in a journal or to begin one; every fault of it is raised together."""
    from shopfloor.errors import InputError
    from shopfloor.journal.pieces import clock_of, issued_plan, made_at
    from shopfloor.model.clock import Clock
    from shopfloor.model.results import Fault
    from shopfloor.read.plan import MAX_PLAN_BYTES
    from shopfloor.read.plan_json import is_json, read_plan_json
    from shopfloor.read.rules import Findings
    from shopfloor.read.source import take

    taken = take(sys.stdin.buffer if plan == "-" else Path(plan), limit=MAX_PLAN_BYTES)

    def fault(rule: str, problem: str, advice: str, row: int = 0, column: str = "") -> InputError:
        return InputError([Fault(taken.name, row, column, "", rule, problem, advice)])

    if not is_json(taken):
        raise fault("plan-no-json", "is no plan.json", "give the plan.json that `plan --out` wrote")
    findings = Findings()
    clock, head = Clock(), {}
    try:
        head = json.loads(taken.data)
        clock = clock_of(head)
    except ValueError as error:
        if head:
            raise fault("plan-clock", f"has no clock: {error}", "make the plan anew") from None
    except (AttributeError, RecursionError):
        head = {}  # the reader says what is wrong
    stated = read_plan_json(taken, clock, findings)
    bad = ((stated.end_s <= stated.start_s) | (stated.unit < 1)).nonzero()[0].tolist()
    if bad:
        row, advice = int(stated.row[bad[0]]), "audit the plan, then open it"
        raise fault(
            "plan-row-impossible", "ends before it starts, or has no unit", advice, row, "assignments"
        )
    known = () if journal is None else journal.known(made_at(head))
    return issued_plan(stated, head, sha256=taken.sha256, name=taken.name, known=known)


# ---- many at once ------------------------------------------------------------------------------------


def import_file(
    file: Annotated[str, typer.Argument(metavar="FILE", help="CSV or XLSX, or - for standard input.")],
    journal: shared.JournalOption = None,
    who: shared.WhoOption = "",
    accept: shared.AcceptOption = False,
    as_json: common.JsonOption = False,
    quiet: common.QuietOption = False,
) -> None:
    """Record every row of a table of events, or none and list every fault.

    Columns: event (start, stop, resume, finish, left, down, up, crew, add, change, cancel, remark), at;
    order, machine, piece, unit, good, scrap, reason, minutes, heads, pool, text, release, due, priority,
    who, id, as each event needs them. A file imported twice is recorded once.

    Exit code 0: all recorded. 1: some event cannot be. 2: bad input.
    """
    from dataclasses import replace

    from shopfloor.errors import InputError
    from shopfloor.journal.errors import RefusedError

    with shared.open_journal(journal) as opened:
        by = shared.recorder(opened.clock, accept)
        try:
            rows = _rows(file, opened, by.now_s)
        except InputError as error:
            shared.refuse_file(error, as_json)
        entries = [entry if entry.who else replace(entry, who=who) for entry in rows.entries]
        try:
            done = opened.record(entries, by)
        except RefusedError as error:
            shared.refuse_faults(rows.refused(error.refusals), as_json, code=common.NO, count=True)
        if as_json:
            shared.print_recorded(done, opened, as_json=True, quiet=quiet)
        elif not quiet:
            again = sum(one.repeat for one in done)
            known = f"; {again:,} were recorded already" if again else ""
            print(f"Recorded {len(done) - again:,} of {len(done):,} rows{known}.")
            for one in done:
                if one.notes:
                    print(shared.recorded_line(one, opened.clock))


def _rows(file: str, journal: Journal, now: int | None) -> Rows:
    """Read a table of events; faults of cells and of the table are raised together."""
    from shopfloor.errors import InputError
    from shopfloor.journal.rows import COLUMNS, NEEDED, Rows
    from shopfloor.read.headers import Wanted
    from shopfloor.read.match import match_columns
    from shopfloor.read.rules import Findings
    from shopfloor.read.table import gather, open_table

    findings, wanted = Findings(), Wanted(COLUMNS, NEEDED)
    table = open_table(sys.stdin.buffer if file == "-" else Path(file), wanted, findings)
    try:
        positions = match_columns(table, wanted, findings)
        findings.stop_if_any()
    except InputError as error:
        raise InputError([_without_mapping(fault) for fault in error.faults]) from None
    cells = gather(table, positions, findings)
    if not len(cells):
        findings.fault(table.place, "no-rows")
    rows = Rows(journal.clock, now, shared.seconds_of, table.place.file, table.place.sheet)
    if all(name in positions for name in NEEDED):
        for index, row in enumerate(cells.row.tolist()):
            rows.take(row, {name: column.text(index) for name, column in cells.columns.items()})
    if rows.faults:
        findings.merge(InputError(rows.faults))
    findings.stop_if_any()
    return rows


def _without_mapping(fault: Fault) -> Fault:
    """Return a fault of a header without the advice to map it: no shop.toml is read here."""
    from dataclasses import replace

    return replace(fault, advice=fault.advice.partition(", or map it")[0])


def scan(
    journal: shared.JournalOption = None,
    machine: Annotated[
        str,
        typer.Option(
            "--machine",
            metavar="MACHINE",
            help="The machine that the scanner is fixed to.",
            show_default=False,
        ),
    ] = "",
    who: shared.WhoOption = "",
    accept: shared.AcceptOption = False,
    as_json: common.JsonOption = False,
    quiet: common.QuietOption = False,
) -> None:
    """Record from a bar-code scanner that types like a keyboard, until the input ends.

    One code a line, or several parted by tabs: a machine, an order, then a verb: START, STOP, RESUME,
    FINISH, DOWN, UP; CLEAR drops what was scanned. Before the verb also NAME=value: PIECE, UNIT, GOOD,
    SCRAP, LEFT, REASON, AT, WHO, and ORDER or MACHINE for a name that reads like a verb.
    Every line is answered; a line with a fault is skipped.

    Exit code 0: every line was sound. 1: some entry was refused. 2: some line could not be read.
    """
    from shopfloor.journal.errors import RefusedError
    from shopfloor.journal.moments import read
    from shopfloor.journal.scan import Scanner

    worst = common.DONE
    with shared.open_journal(journal) as opened:
        clock = opened.clock
        scanner = Scanner(
            opened.knows,
            lambda text: read(clock, text, shared.recorder(clock).now_s),
            shared.seconds_of,
            machine=machine,
            who=who,
        )
        number = 0
        for number, line in enumerate(sys.stdin, 1):
            said = scanner.take(line)
            if said.fault:
                worst = common.BAD_INPUT
                _answer(number, as_json, False, f"Skipped: {said.fault}.", fault=said.fault)
            elif said.entries:
                try:
                    done = opened.record(said.entries, shared.recorder(clock, accept))
                except RefusedError as error:
                    worst = max(worst, common.NO)
                    text = "; ".join(one.text() for one in error.refusals)
                    _answer(number, as_json, False, f"Refused: {text}.", refused=text)
                else:
                    text = "\n".join(shared.recorded_line(one, clock) for one in done)
                    if as_json or not quiet:
                        listed = [shared.recorded_data(one) for one in done]
                        _answer(number, as_json, True, text, entries=listed)
            elif said.kept and (as_json or not quiet):
                _answer(number, as_json, True, f"… {said.kept}", kept=said.kept)
        if scanner.pending:
            worst = common.BAD_INPUT
            text = f"the input ended before a verb; not recorded: {scanner.pending}"
            _answer(number, as_json, False, f"Skipped: {text}.", fault=text)
    raise typer.Exit(worst)


def _answer(number: int, as_json: bool, ok: bool, text: str, **more: Any) -> None:
    """Answer one line at once, on the stream where whoever scans looks."""
    if as_json:
        print(json.dumps({"line": number, "ok": ok, **more}, ensure_ascii=False), flush=True)
    else:
        clean = "".join(c if c.isprintable() or c == "\n" else "?" for c in text)
        print(f"Line {number}: {clean}", file=sys.stdout if ok else sys.stderr, flush=True)


# ---- looking -----------------------------------------------------------------------------------------


def show(
    journal: shared.JournalOption = None,
    at: Annotated[
        str | None, typer.Option("--at", metavar="TIME", help="How it stood then; now without it.")
    ] = None,
    entries: Annotated[
        int, typer.Option("--entries", metavar="N", help="How many of the last entries to list.", min=0)
    ] = SHOWN,
    as_json: common.JsonOption = False,
    quiet: common.QuietOption = False,
) -> None:
    """Show how the shift stands and the last entries; the file is checked on the way and not written to.

    Exit code 0: done. 2: bad input, or the file is damaged.
    """
    from shopfloor.journal.errors import EntryError
    from shopfloor.journal.moments import read, say
    from shopfloor.journal.state import state
    from shopfloor.render import log_text
    from shopfloor.render.lines import wrap

    with shared.open_journal(journal, write=False) as opened:
        clock = opened.clock
        now = shared.recorder(clock).now_s
        try:
            at_s = now if at is None else read(clock, at, now)
        except EntryError as error:
            shared.refuse_value(error, as_json)
        opened.check()
        listed = opened.events()
    if at is None and at_s is not None:
        last = max((event.at_s for event in listed if event.kind != "withdrawn"), default=0)
        end = opened.shift_end_s if opened.shift_end_s is not None else last
        at_s = min(max(at_s, 0), max(last, end))  # long after the shift, how it ended
    found = state(listed, at_s)
    if as_json:
        data = {"ok": True, "state": log_text.state_data(found)}
        common.print_json({**data, "entries": [log_text.event_data(event) for event in listed]})
        return
    if quiet:
        return

    def spoken(seconds: int) -> str:
        return say(clock, seconds)

    start = f"shift from {clock.start:%Y-%m-%d %H:%M}" if clock.start else "time counts from 0:00"
    print(wrap(f"{opened.path.name}: {start}, {len(listed):,} entries."))
    print("\n".join(log_text.state_lines(found, spoken)))
    if entries:
        print("\nLast entries")
        for event in listed[-entries:]:
            print(wrap(f"No {event.seq}: {log_text.sentence(event, spoken)}", 2))
