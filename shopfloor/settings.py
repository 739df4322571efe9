"""One table of every setting: name, default, unit, help.

The command-line options, the `options` object of plan.json and the table in the README are built
from it, so a default stands in one place only.
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Setting:
    """One setting as users see it."""

    name: str
    default: int | float | str | bool | None
    unit: str
    help: str


SETTINGS: dict[str, Setting] = {
    setting.name: setting
    for setting in (
        Setting("round", 30, "minutes", "Length of one round when the file gives no times."),
        Setting(
            "start",
            None,
            "YYYY-MM-DDTHH:MM",
            "Start of the shift, YYYY-MM-DDTHH:MM; without it time counts from 0:00.",
        ),
        Setting("end", None, "YYYY-MM-DDTHH:MM or HH:MM", "End of the shift, HH:MM or YYYY-MM-DDTHH:MM."),
        Setting("crew", None, "heads", "One crew of so many heads attends every machine."),
        Setting("even", False, "", "Rounds hold as equally many operations as they can: a steady crew."),
        Setting("split", False, "", "Every operation may be cut into parts."),
        Setting(
            "objective",
            "makespan,tardiness",
            "",
            "What counts first, and what then; changeovers may be named too.",
        ),
        Setting("shortest-piece", 0, "minutes", "No operation is cut into pieces shorter than this."),
        Setting("time-limit", 30.0, "seconds", "Longest search for a better plan."),
        Setting(
            "workers",
            0,
            "threads",
            "Solver threads; 0 takes one a core, and more where that helps.",
        ),
        Setting("seed", 0, "", "Seed of every random choice."),
        Setting("stamp", None, "text", "Printed on sheets and pages as the time of printing."),
    )
}

# Limits on hostile or mistaken input. Each is enforced where the data enters, with its own fault.
MAX_FILE_BYTES = 90 * 1024 * 1024
MAX_ROWS = 1_500_000
MAX_CELL_CHARACTERS = 1_000
MAX_NAME_CHARACTERS = 80
MAX_MINUTES = 60 * 24 * 365
MAX_QUANTITY = 10_000_000
MAX_PRIORITY = 1_000  # with three decimals: sums of weighted seconds stay exact in 64 bits
MAX_STEP = 100_000
MAX_FAULTS_SHOWN = 200


def default(name: str) -> int | float | str | bool | None:
    """Return the default of the setting `name`.

    Raises
    ------
    KeyError
        If there is no such setting.
    """
    return SETTINGS[name].default
