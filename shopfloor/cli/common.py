"""What every command shares: options built from the settings table, exit codes, printing, faults."""

from __future__ import annotations

import json
import sys
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any, NoReturn

import typer

from shopfloor.settings import SETTINGS

if TYPE_CHECKING:
    from shopfloor.errors import InputError
    from shopfloor.model.results import Fault
    from shopfloor.read.orders import Reading

DONE, NO, BAD_INPUT, NO_PLAN = 0, 1, 2, 3  # exit codes of every command


def setting(name: str, *flags: str, metavar: str | None = None, least: float | None = None) -> Any:
    """Return a command-line option for the setting `name`; its help and unit come from the table.

    A value below `least` is refused.
    """
    entry, shown = SETTINGS[name], SETTINGS[name].help
    if entry.default is not None and entry.default is not False:
        value = f"{entry.default:g}" if isinstance(entry.default, float) else entry.default
        shown += f" [default: {value} {entry.unit}]".replace(" ]", "]")
    return typer.Option(
        *(flags or (f"--{name}",)), help=shown, metavar=metavar, show_default=False, min=least
    )


OrdersArgument = Annotated[
    str, typer.Argument(metavar="ORDERS", help="CSV or XLSX file, or - for standard input.")
]
ShopOption = Annotated[
    Path | None,
    typer.Option("--shop", metavar="FILE", help="shop.toml: the shift, the machines, your column names."),
]
StartOption = Annotated[str | None, setting("start", metavar="TIME")]
EndOption = Annotated[str | None, setting("end", metavar="TIME")]
RoundOption = Annotated[float | None, setting("round", metavar="MINUTES")]
CrewOption = Annotated[int | None, setting("crew", metavar="N")]
EvenOption = Annotated[bool, setting("even", "--even")]
SplitOption = Annotated[bool, setting("split", "--split")]
JsonOption = Annotated[bool, typer.Option("--json", help="Print machine-readable results.")]
QuietOption = Annotated[bool, typer.Option("--quiet", "-q", help="Print nothing but errors.")]


def read(
    orders: str,
    shop: Path | None,
    start: str | None,
    end: str | None,
    round_minutes: float | None,
    *,
    crew: int | None = None,
    split: bool = False,
) -> Reading:
    """Read the orders file (or standard input) and shop.toml; every fault of both is raised together."""
    from shopfloor.read.orders import load

    source: Any = sys.stdin.buffer if orders == "-" else Path(orders)
    return load(source, shop=shop, start=start, end=end, round_minutes=round_minutes, crew=crew, split=split)


def fault_data(fault: Fault) -> dict[str, Any]:
    """Return a fault as plain data for ``--json``."""
    names = ("file", "sheet", "row", "column", "value", "rule", "problem", "advice")
    return {name: getattr(fault, name) for name in names}


def one_of(option: str, given: str | None, allowed: tuple[str, ...]) -> None:
    """Refuse an option whose value is none of those allowed."""
    if given is not None and given not in allowed:
        raise typer.BadParameter(f"{given!r} is not one of {', '.join(allowed)}", param_hint=option)


def print_json(data: Any) -> None:
    """Print one JSON document on standard output."""
    print(json.dumps(data, indent=2, ensure_ascii=False))


def print_notices(notices: tuple[Fault, ...], quiet: bool) -> None:
    """Print what was noticed on standard error, so that results stay clean."""
    from shopfloor.render.lines import wrap

    if not quiet:
        for notice in notices:
            print(wrap(f"Note: {notice.text()}"), file=sys.stderr)


def refuse(error: InputError, as_json: bool) -> NoReturn:
    """Print every fault of an input and leave with the exit code for bad input."""
    from shopfloor.render.lines import fault_lines

    if as_json:
        faults = [fault_data(fault) for fault in error.faults]
        print_json({"ok": False, "faults": faults, "notices": [fault_data(n) for n in error.notices]})
    else:
        count = "1 fault" if len(error.faults) == 1 else f"{len(error.faults):,} faults"
        print(f"{count}; nothing was planned or written.", file=sys.stderr)
        print("\n".join(fault_lines(error.faults)), file=sys.stderr)
    raise typer.Exit(BAD_INPUT)


def see_that_it_can_be_written(out: Path | None) -> None:
    """Refuse a folder that cannot be written before a search, and not after it."""
    if out is not None:
        from shopfloor.render.save import refuse_unwritable

        refuse_unwritable(out)
