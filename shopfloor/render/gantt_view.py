"""Exactly what the Gantt page shows, as one documented value; the page adds drawing and no facts.

Times are whole seconds since the shift's start, as everywhere inside the tool.
"""

from __future__ import annotations

from dataclasses import dataclass

from shopfloor.model.shop import Ints


@dataclass(frozen=True, slots=True)
class SummaryLine:
    """One line of the strip above the chart: a word in front and a sentence."""

    label: str
    text: str


@dataclass(frozen=True, slots=True)
class ColourGroup:
    """How the bars of one group look: `fill` colour, and the `name` that the legend gives it.

    Groups must stay apart in print without colour: fills differ in brightness and each has its own
    `pattern` (``plain``, ``dots``, ``stripes``, ``back-stripes``, ``grid``, ``upright``); `ink` is for text
    on the fill.
    """

    name: str
    fill: str
    ink: str
    pattern: str


@dataclass(frozen=True, slots=True)
class Family:
    """A setup family; `name` is empty for operations without one, `group` an index into the family groups."""

    name: str
    group: int


@dataclass(frozen=True, slots=True)
class MachineRow:
    """One machine, or one unit of a group: a row of the chart.

    `unit` is 0 for a machine that is no group; `name` is the longer name, where one is known; `binds`
    marks the machine that the best bound rests on; `crew` is the crew whose heads its operations take, or
    empty, and `set_up_only` says that they take them only for the set-up.
    """

    machine: str
    unit: int
    name: str
    binds: bool
    crew: str = ""
    set_up_only: bool = False

    @property
    def label(self) -> str:
        """The row as people say it; units are numbered only where there are several."""
        return f"{self.machine} unit {self.unit}" if self.unit else self.machine


@dataclass(frozen=True, slots=True)
class MarkedTime:
    """A vertical line: `kind` is ``finish``, ``bound``, ``proved`` (both in one), or ``shift``.

    `text` is written beside the line where it fits inside the frame, `short` where it does not.
    """

    kind: str
    at_s: int
    text: str
    short: str


@dataclass(frozen=True, slots=True)
class ShutTime:
    """A time when one row, or with `row` None the whole hall, is shut; drawn hatched and named."""

    row: int | None
    start_s: int
    end_s: int
    reason: str


@dataclass(frozen=True, slots=True)
class IdleGap:
    """Time in which a `row` of the binding machine waits, from `start_s` to `end_s`.

    `seconds` leaves closures out; a changeover is no idle time.
    """

    row: int
    start_s: int
    end_s: int
    seconds: int


@dataclass(frozen=True, eq=False)
class ChangeColumns:
    """The changeovers as columns, one entry a changeover; drawn apart from the runs.

    Attributes
    ----------
    bar
        Index of the bar that follows.
    start_s, end_s
        From when to when, as late as possible; a closure may lie between.
    seconds
        How much open time it takes.
    before
        Index into the families: what it changes from. It changes to the family of its bar.
    """

    bar: Ints
    start_s: Ints
    end_s: Ints
    seconds: Ints
    before: Ints

    def __len__(self) -> int:
        return len(self.bar)


@dataclass(frozen=True, eq=False)
class CrewRow:
    """One crew: a row of its own under the machines, heads at work against heads there.

    Attributes
    ----------
    crew
        Its name.
    binds
        Whether the best bound rests on it.
    most
        Most heads at work or there at any time: the height of the row.
    at_s
        When each step begins; the last one is the end of the chart.
    used, there
        Heads at work and heads there, from then on.
    """

    crew: str
    binds: bool
    most: int
    at_s: Ints
    used: Ints
    there: Ints


@dataclass(frozen=True, eq=False)
class Load:
    """How busy each row is over time, for windows that hold more bars than anybody can tell apart.

    Attributes
    ----------
    step_s
        Length of a step.
    steps
        Steps in a row.
    share
        Row by row: 0 where a row is idle all through the step, 31 where it is busy all through, and between
        the two in even steps of the share of the time that a bar lies in.
    """

    step_s: int
    steps: int
    share: Ints


@dataclass(frozen=True, eq=False)
class OrderColumns:
    """The orders as columns, one entry an order, in the order of the file.

    Attributes
    ----------
    ids
        As written in the file, also inside bars.
    release_s, due_s
        Earliest start and wanted finish, which may lie before the shift; ``NO_DUE`` where there is none.
    finish_s
        When its last operation ends, also where that has no bar on the page.
    binds
        Index of the order that the best bound rests on, or -1.
    """

    ids: tuple[str, ...]
    release_s: Ints
    due_s: Ints
    finish_s: Ints
    binds: int


@dataclass(frozen=True, eq=False)
class BarColumns:
    """The bars as columns, one entry an assignment, by start.

    Attributes
    ----------
    start_s, end_s
        From when to when.
    row, order
        Index into the machine rows and the orders.
    group
        Index into the colour groups.
    family
        Index into the families; 0 where families play no part.
    set_up_end_s
        When its set-up is done; its start where it has none.
    paused_s
        How much of it the machine is shut.
    heads
        Heads it takes from its machine's crew.
    way_s
        How long the order is then on its way to its next machine.
    round
        1 …, or 0 outside unit rounds.
    part, parts
        Which piece of how many of its operation.
    notes
        Bar index to note, only where the file had one.
    """

    start_s: Ints
    end_s: Ints
    row: Ints
    order: Ints
    group: Ints
    family: Ints
    set_up_end_s: Ints
    paused_s: Ints
    heads: Ints
    way_s: Ints
    round: Ints
    part: Ints
    parts: Ints
    notes: dict[int, str]

    def __len__(self) -> int:
        return len(self.start_s)


@dataclass(frozen=True, eq=False)
class GanttView:
    """Everything the Gantt page shows.

    Attributes
    ----------
    title, subtitle
        Heading: which shift; what it was made from and how much it holds.
    stamp
        Time of printing as text, if wanted.
    finish
        The makespan as people say it; the largest text on the page.
    verdict
        Half a sentence under it: proved earliest, or how far above the bound.
    summary
        At most five lines: bound, what binds, late orders, the shift, what would help.
    start
        Wall time of second zero as ``YYYY-MM-DDTHH:MM:SS``, or None to show elapsed time.
    clock_changes
        Pairs ``(from_s, offset_s)``: from then on the wall clock is ahead of elapsed time by that much.
    horizon_s
        Where the chart ends; the whole plan, its bound and the shift lie before.
    window_s
        From when to when the chart shows at first.
    rows
        Machines and units, in the shop's order.
    orders, bars
        Columns.
    groups
        Colour groups by lateness, for bars and legend.
    families, family_groups, by_family
        Families and the colour groups that they fall into, both empty where families play no part; and
        whether the page opens in the colours of families.
    lines
        Finish, bound and the shift's end.
    shift_end_s
        From here on the chart is shaded; None when it is not known.
    rounds_s
        When each round starts, for faint boundaries; empty outside unit rounds.
    closures, changeovers
        Drawn where there are any.
    gaps
        Idle time of the binding machine.
    crews
        A row each, under the machines.
    load, detail_s
        How busy the rows are, on a page with very many operations, else None; and up to when the page has
        every bar.
    left_out
        What the page leaves out, as a sentence; empty where it has everything.
    now_s
        A line at this time, or None. The reader can switch on one that follows the computer's clock.
    about
        Terms and texts on how the plan was made.
    care
        The notice that every page carries.
    """

    title: str
    subtitle: str
    stamp: str | None
    finish: str
    verdict: str
    summary: tuple[SummaryLine, ...]
    start: str | None
    clock_changes: tuple[tuple[int, int], ...]
    horizon_s: int
    window_s: tuple[int, int]
    rows: tuple[MachineRow, ...]
    orders: OrderColumns
    bars: BarColumns
    groups: tuple[ColourGroup, ...]
    families: tuple[Family, ...]
    family_groups: tuple[ColourGroup, ...]
    by_family: bool
    lines: tuple[MarkedTime, ...]
    shift_end_s: int | None
    rounds_s: tuple[int, ...]
    closures: tuple[ShutTime, ...]
    changeovers: ChangeColumns
    gaps: tuple[IdleGap, ...]
    crews: tuple[CrewRow, ...]
    load: Load | None
    detail_s: int
    left_out: str
    now_s: int | None
    about: tuple[tuple[str, str], ...]
    care: str
