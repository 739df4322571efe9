"""Reads the published instances in ``data/benchmarks``, and writes them as orders files."""

from __future__ import annotations

import csv
from dataclasses import dataclass
from pathlib import Path

from shopfloor.model.shop import Shop, shop_of

FOLDER = Path(__file__).parents[2] / "data" / "benchmarks"
SETS = ("taillard", "brucker", "gueret-prins")
MINUTE = 60


@dataclass(frozen=True)
class Instance:
    """A published open shop: times of orders (rows) on machines (columns), and what is known of it."""

    set: str
    name: str
    times: tuple[tuple[int, ...], ...]
    load_bound: int
    best_known: int
    proved: bool

    @property
    def group(self) -> str:
        """What the instance is reported with: `tai10`, `j7`, `gp09`."""
        return self.name.split("_")[0].split("-")[0]

    def shop(self, unit_s: int = MINUTE) -> Shop:
        """Return the shop, a unit of time taken as a minute unless said."""
        return shop_of([[time * unit_s for time in row] for row in self.times])


def instances(*sets: str) -> list[Instance]:
    """Return the instances of the named sets, all unless said, in the order of their files."""
    with (FOLDER / "optima.csv").open(newline="") as file:
        known = {row["instance"]: row for row in csv.DictReader(file)}
    found: list[Instance] = []
    for name in sets or SETS:
        times: dict[str, dict[tuple[int, int], int]] = {}
        with (FOLDER / f"{name}.csv").open(newline="") as file:
            for row in csv.DictReader(file):
                cells = times.setdefault(row["instance"], {})
                cells[int(row["job"]), int(row["machine"])] = int(row["duration"])
        for instance, cells in times.items():
            size = max(job for job, _ in cells)
            table = tuple(tuple(cells[j + 1, m + 1] for m in range(size)) for j in range(size))
            facts = known[instance]
            found.append(
                Instance(
                    name,
                    instance,
                    table,
                    int(facts["load_bound"]),
                    int(facts["best_known"]),
                    facts["proven_optimal"] == "yes",
                )
            )
    return found


def orders_csv(instance: Instance) -> str:
    """Return the instance as an orders file, times as minutes; what takes no time is left out."""
    rows = ["order,machine,minutes"]
    for job, times in enumerate(instance.times, 1):
        rows += [f"J{job},M{machine},{time}" for machine, time in enumerate(times, 1) if time]
    return "\n".join(rows) + "\n"
