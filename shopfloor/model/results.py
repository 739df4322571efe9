"""What comes out: faults of an input, bounds with witnesses, outcomes of methods, violations, plans."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from html import escape
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    import pandas as pd

    from shopfloor.model.schedule import Schedule
    from shopfloor.model.shop import Shop

PLAN_SCHEMA = 1  # the version of plan.json that this release writes


@dataclass(frozen=True, slots=True)
class Fault:
    """One thing wrong with an input file (or, as a notice, worth saying), and where it stands.

    Attributes
    ----------
    file, sheet, row, column
        Where; `row` counts from 1 as a spreadsheet does, 0 when the whole file is meant.
    value
        What stood there, shortened.
    rule
        A short stable code such as ``minutes-not-positive``.
    problem
        What is wrong, as the end of a sentence that begins with the value.
    advice
        What to do.
    """

    file: str
    row: int
    column: str
    value: str
    rule: str
    problem: str
    advice: str
    sheet: str = ""

    @property
    def where(self) -> str:
        """The place as people say it: ``orders.csv row 7, column minutes``."""
        place = f"{self.file} [{self.sheet}]" if self.sheet else self.file
        if self.row:
            place += f" row {self.row}"
        return f"{place}, column {self.column}" if self.column else place

    def text(self) -> str:
        """One line: place, value, problem, advice."""
        value = f"{self.value!r} " if self.value or self.column else ""
        return f"{self.where}: {value}{self.problem}; {self.advice}"


@dataclass(frozen=True, slots=True)
class Bound:
    """A time that no plan can beat, the thing that proves it, and a sentence for people.

    `witness` holds only what the audit needs to derive the value again by arithmetic.
    """

    kind: str
    value_s: int
    witness: Mapping[str, Any]
    sentence: str


@dataclass(frozen=True, slots=True)
class Outcome:
    """What a method hands back.

    Attributes
    ----------
    schedule
        None when the method found none.
    proven_s
        The best lower bound that the method itself proved, 0 if none.
    stopped
        ``done``, ``time limit`` or ``interrupted``.
    repeatable
        Whether the same input, options and seed give the same schedule again.
    remarks
        Sentences about what is and is not proved, for the plan's summary.
    """

    schedule: Schedule | None
    proven_s: int = 0
    stopped: str = "done"
    repeatable: bool = True
    remarks: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Violation:
    """One broken rule in a plan: the rule's code, a sentence, and the clashing rows of the plan file."""

    rule: str
    sentence: str
    rows: tuple[int, ...] = ()


@dataclass(frozen=True, slots=True)
class Choice:
    """Which method made the plan, why, and why the ones tried before it did not."""

    name: str
    why: str
    others: Mapping[str, str]


@dataclass(frozen=True, slots=True)
class Lateness:
    """One order that finishes after its due time."""

    order: str
    due_s: int
    finish_s: int

    @property
    def late_s(self) -> int:
        """By how much."""
        return self.finish_s - self.due_s


@dataclass(frozen=True, slots=True)
class Plan:
    """A schedule with its bounds, how it was found and what it was made from.

    Attributes
    ----------
    bounds
        Best first; never empty for a shop with operations.
    inputs
        Name and SHA-256 of each file read.
    options
        The settings that could change the schedule.
    remarks
        Sentences for the summary: what is proved, what is not.
    would_help
        Sentences on what would let it end earlier, best first.
    """

    shop: Shop
    schedule: Schedule
    bounds: tuple[Bound, ...]
    choice: Choice
    inputs: tuple[tuple[str, str], ...] = ()
    options: Mapping[str, Any] = field(default_factory=dict)
    remarks: tuple[str, ...] = ()
    would_help: tuple[str, ...] = ()
    stopped: str = "done"
    repeatable: bool = True

    @property
    def makespan_s(self) -> int:
        """Finish of the last operation, seconds since the shift's start."""
        return self.schedule.makespan_s

    @property
    def lower_bound_s(self) -> int:
        """The best bound; 0 for a shop without operations."""
        return self.bounds[0].value_s if self.bounds else 0

    @property
    def gap_s(self) -> int:
        """Makespan minus bound."""
        return self.makespan_s - self.lower_bound_s

    @property
    def proved_optimal(self) -> bool:
        """Whether nothing can end earlier, and that is proved."""
        return self.gap_s == 0

    @property
    def fits_shift(self) -> bool | None:
        """Whether everything ends by the shift's end; None when the end is not known."""
        end = self.shop.shift_end_s
        return None if end is None else self.makespan_s <= end

    def late_orders(self) -> list[Lateness]:
        """Return the orders that finish after their due time, latest first."""
        orders = self.shop.orders
        finish = self.schedule.completion_s(self.shop.operations.job, len(orders))
        late = [
            Lateness(orders.ids[index], int(orders.due_s[index]), int(finish[index]))
            for index in (finish > orders.due_s).nonzero()[0]
        ]
        return sorted(late, key=lambda row: (-row.late_s, row.order))

    def _repr_html_(self) -> str:
        """Return the summary that notebooks show; `gantt_figure(plan)` draws the plan itself."""
        say = self.shop.clock.say
        bound = self.bounds[0].sentence if self.bounds else "There is nothing to do."
        late = ", ".join(
            f"{row.order} (due {say(row.due_s)}, ends {say(row.finish_s)})" for row in self.late_orders()
        )
        fits = {None: "the shift's end is not known", True: "yes", False: "no"}[self.fits_shift]
        rows = {
            "Ends": say(self.makespan_s)
            + (", proved: nothing can end earlier" if self.proved_optimal else ""),
            "Bound": bound,
            "Method": self.choice.name,
            "Fits the shift": fits,
            "Late": late or "none",
        }
        cells = "".join(
            f"<tr><th>{escape(name)}</th><td>{escape(text)}</td></tr>" for name, text in rows.items()
        )
        return f"<table>{cells}</table><p>This is a plan, not a permit: isolate and lock out first.</p>"

    def to_frame(self) -> pd.DataFrame:
        """Return the assignments as a pandas table with the columns of plan.csv, and seconds beside."""
        from shopfloor.model.frame import frame_from_schedule  # pandas is heavy: only when asked for

        return frame_from_schedule(self.shop, self.schedule)
