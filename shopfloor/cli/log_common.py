"""What the subcommands of ``log`` share: options, opening a journal, printing the outcome."""

from __future__ import annotations

import inspect
import sys
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any, NoReturn

import typer

from shopfloor.cli import common

if TYPE_CHECKING:
    from shopfloor.errors import InputError
    from shopfloor.journal.entries import Entry
    from shopfloor.journal.errors import EntryError, RefusedError
    from shopfloor.journal.events import Journal, Recorded, Recorder
    from shopfloor.model.clock import Clock

JournalOption = Annotated[
    Path | None,
    typer.Option(
        "--journal",
        metavar="FILE",
        envvar="SHOPFLOOR_JOURNAL",
        help="The shift's journal.",
        show_default=False,
    ),
]
WhoOption = Annotated[
    str,
    typer.Option("--who", metavar="NAME", envvar="SHOPFLOOR_WHO", help="Who says so.", show_default=False),
]
AtOption = Annotated[
    str | None,
    typer.Option("--at", metavar="TIME", help="When it happened, HH:MM (or elapsed h:mm); now without it."),
]
IdOption = Annotated[
    str, typer.Option("--id", metavar="TEXT", help="Your own id: a repeat is harmless.", show_default=False)
]
CorrectsOption = Annotated[
    int, typer.Option("--corrects", metavar="NO", help="This replaces entry number NO.", show_default=False)
]
AcceptOption = Annotated[bool, typer.Option("--accept", help="Record with a mark what would be refused.")]
ReasonOption = Annotated[
    str, typer.Option("--reason", metavar="TEXT", help="Why, in a few words.", show_default=False)
]
PieceOption = Annotated[
    int,
    typer.Option("--piece", metavar="N", help="Which one, where the order has several.", show_default=False),
]
UnitOption = Annotated[
    int, typer.Option("--unit", metavar="N", help="Which unit of a machine group.", show_default=False)
]
LeftOption = Annotated[
    str | None, typer.Option("--left", metavar="MINUTES", help="How long it will still take.")
]
OrderArgument = Annotated[str, typer.Argument(metavar="ORDER", help="Order number.")]
MachineArgument = Annotated[str, typer.Argument(metavar="MACHINE", help="Machine or group.")]


Making = dict[str, Any]  # the fields of an entry and its data; times and lengths as text still


@dataclass(frozen=True, slots=True)
class Ask:
    """The options that every recording subcommand has, and the order in which help lists them."""

    at: AtOption = None
    who: WhoOption = ""
    journal: JournalOption = None
    id: IdOption = ""
    corrects: CorrectsOption = 0
    accept: AcceptOption = False
    as_json: common.JsonOption = False
    quiet: common.QuietOption = False


def recording(make: Callable[..., Making | list[Making]]) -> Callable[..., None]:
    """Turn a function that makes entries of its own options into a command that records them.

    The command takes the options of :class:`Ask` as well.
    """
    signature = inspect.signature(make, eval_str=True)
    shared = inspect.signature(Ask, eval_str=True).parameters

    def command(**given: Any) -> None:
        ask = Ask(**{name: given.pop(name) for name in shared})
        made = make(**given)
        record(ask, made if isinstance(made, list) else [made])

    parameters = [*signature.parameters.values(), *shared.values()]
    command.__doc__ = make.__doc__
    command.__signature__ = signature.replace(  # type: ignore[attr-defined]
        parameters=[one.replace(kind=inspect.Parameter.KEYWORD_ONLY) for one in parameters],
        return_annotation=None,
    )
    command.__annotations__ = {one.name: one.annotation for one in parameters}
    return command


def wall_time() -> datetime:
    """Return the time by this computer's clock; nothing else of the tool asks for it."""
    return datetime.now().astimezone()


def recorder(clock: Clock, accept: bool = False) -> Recorder:
    """Return who records: by the clock of this computer."""
    from shopfloor.journal.events import Recorder
    from shopfloor.journal.moments import now_s

    wall = wall_time()
    return Recorder(now_s(clock, wall), wall.isoformat(timespec="seconds"), accept)


def journal_path(journal: Path | None) -> Path:
    """Return the file to use; there is no default but what somebody named."""
    if journal is None:
        from shopfloor.journal.errors import JournalError

        raise JournalError("no journal is named; give --journal FILE, or set SHOPFLOOR_JOURNAL to it")
    return journal


def open_journal(journal: Path | None, *, write: bool = True) -> Journal:
    """Open the file that somebody named."""
    from shopfloor.journal.events import Journal

    return Journal.open(journal_path(journal), write=write)


def seconds_of(text: str) -> int:
    """Read minutes, such as 12.5 or 0:12, as whole seconds."""
    from shopfloor.journal.errors import EntryError
    from shopfloor.read import cells
    from shopfloor.read.wording import RULES

    try:
        return cells.nearest_second(cells.length(text.strip(), cells.Marks(comma=True, sure=frozenset(".,"))))
    except cells.CellFault as fault:
        rule = RULES[fault.rule]
        problem, advice = (words.format(**fault.words) for words in (rule.problem, rule.advice))
        raise EntryError("minutes", text[:40], fault.rule, problem, advice) from None


# ---- recording ---------------------------------------------------------------------------------------


def record(ask: Ask, makings: Sequence[Making]) -> None:
    """Record entries, all or none, and print them; leave with the exit code where they are not recorded."""
    from shopfloor.journal.errors import EntryError, RefusedError

    with open_journal(ask.journal) as journal:
        by = recorder(journal.clock, ask.accept)
        try:
            entries = [_entry(ask, journal, by, making) for making in makings]
            _in_order(entries, journal.clock)
            done = journal.record(entries, by)
        except EntryError as error:
            refuse_value(error, ask.as_json)
        except RefusedError as error:
            refuse_entry(error, ask.as_json)
        print_recorded(done, journal, as_json=ask.as_json, quiet=ask.quiet)


def _entry(ask: Ask, journal: Journal, by: Recorder, making: Making) -> Entry:
    from shopfloor.journal.entries import Entry
    from shopfloor.journal.moments import read
    from shopfloor.model.actuals import Kind

    def moment(text: str | None, field: str = "at") -> int | None:
        return None if text is None else read(journal.clock, text, by.now_s, field=field)

    values = dict(making)
    at = moment(values.pop("at", ask.at))
    data = {name: values.pop(name) for name in list(values) if name not in Entry.__dataclass_fields__}
    if data.get("left") is not None:
        data["left_s"] = seconds_of(data["left"])
    data.pop("left", None)
    for name in ("release", "due"):
        if name in data:
            data[f"{name}_s"] = moment(data.pop(name), name)
    if data.get("operations") is not None:
        data["operations"] = [_operation(text) for text in data["operations"]]
    values["corrects"] = ask.corrects or values.get("corrects", 0)
    return Entry(Kind(values.pop("kind")), at_s=at, who=ask.who, id=ask.id, data=data, **values)


def _in_order(entries: Sequence[Entry], clock: Clock) -> None:
    """Refuse a start that one call gives after its finish; the journal would only miss the start."""
    from itertools import pairwise

    from shopfloor.journal.errors import EntryError
    from shopfloor.journal.moments import say

    for first, then in pairwise(entries):
        if first.at_s is not None and then.at_s is not None and first.at_s > then.at_s:
            start, end = say(clock, first.at_s), say(clock, then.at_s)
            problem, advice = (
                f"is after the finish, {end}",
                "give the start with --from, the finish with --at",
            )
            raise EntryError("from", start, "from-after-finish", problem, advice)


def _operation(text: str) -> tuple[str, int]:
    from shopfloor.journal.errors import EntryError

    machine, equals, minutes = text.rpartition("=")
    if not equals or not machine.strip():
        raise EntryError(
            "operations", text[:40], "operation-unreadable", "is no MACHINE=MINUTES", "write CMM=25"
        )
    return machine.strip(), seconds_of(minutes)


# ---- printing ----------------------------------------------------------------------------------------


def print_recorded(done: Sequence[Recorded], journal: Journal, *, as_json: bool, quiet: bool) -> None:
    """Print each entry with its number, or that it stood there already."""
    if as_json:
        common.print_json({"ok": True, "entries": [recorded_data(one) for one in done]})
    elif not quiet:
        for one in done:
            print(recorded_line(one, journal.clock), flush=True)


def recorded_data(one: Recorded) -> dict[str, Any]:
    """Return what became of an entry as plain data."""
    from shopfloor.render.log_text import event_data

    return {**event_data(one.event), "repeat": one.repeat, "notes": list(one.notes)}


def recorded_line(one: Recorded, clock: Clock) -> str:
    """Return what became of an entry as a line."""
    from shopfloor.journal.moments import say
    from shopfloor.render.log_text import sentence

    known = " (recorded already)" if one.repeat else ""
    notes = "".join(f"\n  Note: {note}." for note in one.notes)
    return f"No {one.event.seq}{known}: {sentence(one.event, lambda s: say(clock, s))}{notes}"


def refuse_entry(error: RefusedError, as_json: bool) -> NoReturn:
    """Print why an entry cannot be, and leave with the exit code for no."""
    if as_json:
        listed = [
            {"rule": one.rule, "problem": one.problem, "advice": one.advice, "final": one.final}
            for one in error.refusals
        ]
        common.print_json({"ok": False, "refused": listed})
    else:
        print("\n".join(refusal_lines(error)), file=sys.stderr)
    raise typer.Exit(common.NO)


def refusal_lines(error: RefusedError) -> list[str]:
    """Return every reason on lines of its own, and how to insist where that is possible."""
    from shopfloor.render.lines import cut, wrap

    lines = [wrap(f"Refused: {cut(one.text(), 2_000)}.") for one in error.refusals]
    final = any(one.final for one in error.refusals)
    return lines if final else [*lines, "To record it all the same, with a mark, add --accept."]


def refuse_value(error: EntryError, as_json: bool) -> NoReturn:
    """Print what is wrong with a value of the command line, and leave with the exit code for bad input."""
    from shopfloor.model.results import Fault

    words = {"left_s": "minutes", "operations": "machine=minutes", "release_s": "release", "due_s": "due"}
    name = words.get(error.field, error.field)
    refuse_faults([Fault(name, 0, "", error.value, error.rule, error.problem, error.advice)], as_json)


def refuse_faults(
    faults: Iterable[Any], as_json: bool, *, code: int = common.BAD_INPUT, count: bool = False
) -> NoReturn:
    """Print faults and leave; nothing was recorded."""
    from shopfloor.render.lines import fault_lines

    listed = list(faults)
    if as_json:
        common.print_json(
            {"ok": False, "faults": [common.fault_data(fault) for fault in listed], "notices": []}
        )
    else:
        if count:
            noun = "1 fault" if len(listed) == 1 else f"{len(listed):,} faults"
            print(f"{noun}; nothing was recorded.", file=sys.stderr)
        print("\n".join(fault_lines(listed)), file=sys.stderr)
    raise typer.Exit(code)


def refuse_file(error: InputError, as_json: bool) -> NoReturn:
    """Print every fault of a file, and leave with the exit code for bad input."""
    refuse_faults(error.faults, as_json, count=True)
