"""The command `shopfloor`: one module a command, each importing what it needs only when it runs."""

from __future__ import annotations

import os
import sys
from typing import Annotated

import typer

import shopfloor
from shopfloor.cli import audit, check, compare, demo, fit, handover, log, plan, replan
from shopfloor.cli.common import BAD_INPUT, NO_PLAN
from shopfloor.errors import InputError, NoPlanError, ShopfloorError

app = typer.Typer(
    name="shopfloor",
    epilog="A plan is no permit: isolate and lock out first; site procedures and authorised people decide.",
    add_completion=False,
    no_args_is_help=True,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
    context_settings={"help_option_names": ["-h", "--help"]},
)
app.command("check", short_help="Say whether the shift can hold the orders, and what binds.")(check.check)
app.command("plan", short_help="Plan the orders, audit the plan, and write its files.")(plan.plan)
app.command("fit", short_help="Choose what fits the shift; the rest is carried over.")(fit.fit)
app.command("audit", short_help="Check a plan against its orders, also after an edit.")(audit.audit)
app.command("compare", short_help="Show what moved between two plans.")(compare.compare)
app.add_typer(log.app, name="log")
app.command("replan", short_help="Plan what is left of a shift anew, moving little.")(replan.replan)
app.command("handover", short_help="Tell how the shift went, and what carries over.")(handover.handover)
app.command("demo", short_help="Write sample sets of orders to try the tool on.")(demo.demo)


def _show_version(wanted: bool) -> None:
    if wanted:
        print(f"shopfloor {shopfloor.__version__}")
        raise typer.Exit


@app.callback()
def options(
    version: Annotated[
        bool, typer.Option("--version", callback=_show_version, is_eager=True, help="Print the version.")
    ] = False,
) -> None:
    """Turn a spreadsheet of work orders into a proved sequence for every machine."""


def run() -> None:
    """Run the command line; expected errors become one message, a bug keeps its traceback."""
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="replace")  # a bar drawn on an old code page must not end the run
    try:
        app()
    except InputError as error:  # commands print the whole list themselves; this is the safety net
        print("\n".join(fault.text() for fault in error.faults), file=sys.stderr)
        sys.exit(BAD_INPUT)
    except ShopfloorError as error:
        print(f"shopfloor: {error}", file=sys.stderr)
        sys.exit(NO_PLAN if isinstance(error, NoPlanError) else BAD_INPUT)
    except BrokenPipeError:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())  # the reader left; nobody to tell
        sys.exit(0)


if __name__ == "__main__":
    run()
