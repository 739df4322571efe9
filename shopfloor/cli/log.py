"""``shopfloor log``: record what happens on the floor, one event a call."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from shopfloor.cli import common, log_book, log_times
from shopfloor.cli import log_common as shared
from shopfloor.cli.log_common import Ask, Making, recording

app = typer.Typer(
    help="Record what happens on the floor, and show how the shift stands.",
    no_args_is_help=True,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
    context_settings={"help_option_names": ["-h", "--help"]},
)

DueOption = Annotated[str | None, typer.Option("--due", metavar="TIME", help="Wanted finish.")]
ReleaseOption = Annotated[str | None, typer.Option("--release", metavar="TIME", help="Earliest start.")]
PriorityOption = Annotated[
    float | None, typer.Option("--priority", metavar="N", help="Weight of the order, 1 unless said.")
]

app.command("open")(log_book.open_plan)


@app.command("start")
@recording
def start(
    order: shared.OrderArgument,
    machine: shared.MachineArgument,
    piece: shared.PieceOption = 0,
    unit: shared.UnitOption = 0,
    left: shared.LeftOption = None,
) -> Making:
    """ORDER has started on MACHINE.

    Exit code of every entry: 0 recorded (or recorded already), 1 refused since it cannot be, 2 bad input.
    """
    return {
        "kind": "started",
        "order": order,
        "machine": machine,
        "piece": piece,
        "unit": unit,
        "left": left,
    }


@app.command("stop", short_help="ORDER has stopped on MACHINE before it was done.")
@recording
def stop(
    order: shared.OrderArgument,
    machine: shared.MachineArgument,
    reason: shared.ReasonOption = "",
    piece: shared.PieceOption = 0,
    left: shared.LeftOption = None,
) -> Making:
    """ORDER has stopped on MACHINE before it was done; say why with --reason."""
    return {
        "kind": "stopped",
        "order": order,
        "machine": machine,
        "piece": piece,
        "reason": reason,
        "left": left,
    }


@app.command("resume")
@recording
def resume(
    order: shared.OrderArgument,
    machine: shared.MachineArgument,
    piece: shared.PieceOption = 0,
    unit: shared.UnitOption = 0,
    left: shared.LeftOption = None,
) -> Making:
    """ORDER goes on running on MACHINE after a stop."""
    return {
        "kind": "resumed",
        "order": order,
        "machine": machine,
        "piece": piece,
        "unit": unit,
        "left": left,
    }


@app.command("finish", short_help="ORDER is done on MACHINE.")
@recording
def finish(
    order: shared.OrderArgument,
    machine: shared.MachineArgument,
    good: Annotated[int | None, typer.Option("--good", metavar="N", help="Good pieces.")] = None,
    scrap: Annotated[int | None, typer.Option("--scrap", metavar="N", help="Scrapped pieces.")] = None,
    since: Annotated[
        str | None, typer.Option("--from", metavar="TIME", help="Record its start as well.")
    ] = None,
    piece: shared.PieceOption = 0,
) -> list[Making]:
    """ORDER is done on MACHINE; with --from, one call records both its start and its finish."""
    named = {"order": order, "machine": machine, "piece": piece}
    started = [{"kind": "started", "at": since, **named}] if since is not None else []
    return [*started, {"kind": "finished", "good": good, "scrap": scrap, **named}]


@app.command("left", short_help="ORDER will run MINUTES more on MACHINE.")
@recording
def left(
    order: shared.OrderArgument,
    machine: shared.MachineArgument,
    minutes: Annotated[str, typer.Argument(metavar="MINUTES", help="Such as 25, 12.5 or 0:25.")],
    piece: shared.PieceOption = 0,
) -> Making:
    """ORDER will run MINUTES more on MACHINE, whatever the plan said."""
    return {"kind": "left", "order": order, "machine": machine, "piece": piece, "left": minutes}


@app.command("down", short_help="MACHINE is down, or one unit of it.")
@recording
def down(
    machine: shared.MachineArgument,
    reason: shared.ReasonOption = "",
    unit: shared.UnitOption = 0,
) -> Making:
    """MACHINE is down, or one --unit of it; say why with --reason.

    What runs there is blocked, and goes on by itself when the machine is up, unless it is stopped.
    """
    return {"kind": "down", "machine": machine, "unit": unit, "reason": reason}


@app.command("up")
@recording
def up(machine: shared.MachineArgument, unit: shared.UnitOption = 0) -> Making:
    """MACHINE is up again."""
    return {"kind": "up", "machine": machine, "unit": unit}


@app.command("crew")
@recording
def crew(
    heads: Annotated[int, typer.Argument(metavar="HEADS", help="How many people are present.", min=0)],
    pool: Annotated[
        str,
        typer.Option("--pool", metavar="NAME", help="Which crew, if there are several.", show_default=False),
    ] = "",
) -> Making:
    """HEADS people are present from now on."""
    return {"kind": "crew", "heads": heads, "pool": pool}


@app.command("add")
@recording
def add(
    order: shared.OrderArgument,
    operations: Annotated[
        list[str],
        typer.Argument(metavar="MACHINE=MINUTES", help="What it needs, such as CMM=25 WASH=0:10."),
    ],
    due: DueOption = None,
    release: ReleaseOption = None,
    priority: PriorityOption = None,
) -> Making:
    """ORDER has come in during the shift."""
    return {
        "kind": "added",
        "order": order,
        "operations": operations,
        "due": due,
        "release": release,
        "priority": priority,
    }


@app.command("change", short_help="ORDER has changed: due time, release, priority, times.")
@recording
def change(
    order: shared.OrderArgument,
    operations: Annotated[
        list[str] | None,
        typer.Argument(metavar="MACHINE=MINUTES", help="New times; a new machine is a further operation."),
    ] = None,
    due: DueOption = None,
    release: ReleaseOption = None,
    priority: PriorityOption = None,
) -> Making:
    """ORDER has changed: its due time, release, priority, or how long it takes where."""
    return {
        "kind": "changed",
        "order": order,
        "operations": operations or None,
        "due": due,
        "release": release,
        "priority": priority,
    }


@app.command("cancel", short_help="ORDER is cancelled.")
@recording
def cancel(order: shared.OrderArgument, reason: shared.ReasonOption = "") -> Making:
    """ORDER is cancelled; what runs of it stays running until it is stopped or finished."""
    return {"kind": "cancelled", "order": order, "reason": reason}


@app.command("remark")
@recording
def remark(
    text: Annotated[str, typer.Argument(metavar="TEXT", help="Anything the next shift should know.")],
    order: Annotated[
        str, typer.Option("--order", metavar="ORDER", help="The order it is about.", show_default=False)
    ] = "",
    machine: Annotated[
        str, typer.Option("--machine", metavar="MACHINE", help="The machine it is about.", show_default=False)
    ] = "",
) -> Making:
    """Write a remark into the journal."""
    return {"kind": "remark", "text": text, "order": order, "machine": machine}


@app.command("undo", short_help="Strike out an entry.")
def undo(
    number: Annotated[
        int | None, typer.Argument(metavar="NO", help="Number of the entry; without it the last.", min=1)
    ] = None,
    reason: shared.ReasonOption = "",
    at: shared.AtOption = None,
    who: shared.WhoOption = "",
    journal: shared.JournalOption = None,
    id_: shared.IdOption = "",
    accept: shared.AcceptOption = False,
    as_json: common.JsonOption = False,
    quiet: common.QuietOption = False,
) -> None:
    """Strike out an entry, the last one without NO (with --who, the last of that person).

    The entry stays in the journal, and so does the correction. To replace an entry, record it anew with
    --corrects NO.
    """
    ask = Ask(at, who, journal, id_, 0, accept, as_json, quiet)
    corrects = number or _last(journal, who, as_json)
    shared.record(ask, [{"kind": "withdrawn", "corrects": corrects, "reason": reason}])


def _last(journal: Path | None, who: str, as_json: bool) -> int:
    from shopfloor.journal.errors import RefusedError
    from shopfloor.journal.rules import refusal

    with shared.open_journal(journal) as opened:
        event = opened.to_undo(who)
    if event is None:
        whose = f" by {who}" if who else ""
        shared.refuse_entry(RefusedError([refusal(0, "nothing-to-undo", whose=whose)]), as_json)
    return event.seq


app.command("import", short_help="Record a table of events, all of it or nothing.")(log_book.import_file)
app.command("scan", short_help="Record from a bar-code scanner.")(log_book.scan)
app.command("show", short_help="Show how the shift stands, and the last entries.")(log_book.show)
app.command("times", short_help="Compare planned and actual minutes.")(log_times.times)
