"""``shopfloor demo``: write a sample hall to try the tool on."""

from __future__ import annotations

from importlib.resources import files
from pathlib import Path
from typing import Annotated

import typer

SETS = ("rounds", "groups", "crew", "two-machines", "splits", "breaks", "mixed", "overload", "faulty")


def demo(
    folder: Annotated[
        Path, typer.Argument(metavar="DIR", help="Folder to write the sets into; made if needed.")
    ],
) -> None:
    """Write the invented hall "Tern Quay valve overhaul": sets of orders to plan, and one full of faults."""
    from shopfloor.render.save import save

    sample = files("shopfloor.sample")
    for name in SETS:
        content = {
            entry.name: entry.read_bytes() for entry in sample.joinpath(name).iterdir() if entry.is_file()
        }
        save(folder / name, content)
        print(f"Wrote {folder / name}: {', '.join(sorted(content))}")
    print(f"Try: shopfloor check {folder / 'rounds' / 'orders.csv'}")
