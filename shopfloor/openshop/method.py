"""What a method is: a name, what it accepts, and how it solves."""

from __future__ import annotations

import threading
import time
from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Protocol

from shopfloor.model.results import Outcome
from shopfloor.model.shop import Shop


@dataclass(frozen=True, slots=True)
class Progress:
    """Where a search stands; times in seconds since the shift's start, `left_s` of search time."""

    stage: str
    best_s: int | None
    bound_s: int
    left_s: float


@dataclass(frozen=True)
class Effort:
    """How hard to try, and how to be told and stopped.

    Attributes
    ----------
    bound_s
        The best combinatorial lower bound, as a number; a method may stop when it reaches it.
    least_late
        A lower bound of the weighted tardiness of every plan of a shop, in seconds × thousandths of
        priority. It may take a second or two, so it is for asking once a plan is late.
    time_limit_s
        Seconds from `began`.
    workers
        Solver threads; 0 takes one for each core.
    report
        Called now and then, from any thread.
    even
        Whether rounds shall hold as equally many operations as possible, where a method has rounds.
    shortest_piece_s
        No operation may be cut into a piece shorter than this; 0 for no limit.
    stop
        Set by Ctrl-C; a method then hands back the best it has.
    """

    bound_s: int = 0
    least_late: Callable[[Shop], int] = lambda shop: 0
    time_limit_s: float = 30.0
    workers: int = 0
    seed: int = 0
    even: bool = False
    shortest_piece_s: int = 0
    report: Callable[[Progress], None] = lambda progress: None
    stop: threading.Event = field(default_factory=threading.Event)
    began: float = field(default_factory=time.monotonic)

    @property
    def left_s(self) -> float:
        """Search time left, never negative."""
        return max(0.0, self.time_limit_s - (time.monotonic() - self.began))

    @property
    def over(self) -> bool:
        """Whether time is up or somebody asked to stop."""
        return self.stop.is_set() or self.left_s <= 0


class Method(Protocol):
    """One way to make a schedule."""

    @property
    def name(self) -> str:
        """The name that plans and pages show."""

    @property
    def reaches_bound(self) -> bool:
        """Whether the makespan always equals the best combinatorial bound, so that the bound decides."""

    def accepts(self, shop: Shop) -> str | None:
        """Return None when the method solves this shop, or the reason why not as half a sentence."""

    def promise(self, shop: Shop) -> str:
        """Return the sentence that says what the method guarantees on this shop, and its source."""

    def solve(self, shop: Shop, effort: Effort) -> Outcome:
        """Return the best schedule found; never an illegal one."""


def why_not_plain(shop: Shop) -> str | None:
    """Return None when orders go any way at any time, or the first thing that restricts them."""
    if shop.has_steps:
        return "some orders fix the sequence of their steps"
    if len(shop) and shop.head_s.any():
        return "some orders are released after the shift's start"
    if any(machine.crew is not None for machine in shop.machines):
        return "a crew limits how much runs at once"
    if shop.breaks:
        return "breaks interrupt the shift"
    if any(machine.closed for machine in shop.machines):
        return "machines have closures of their own"
    if any(not changeover.none for changeover in shop.changeovers.values()):
        return "machines need changeovers between families"
    if not shop.transport.none:
        return "orders need time between machines"
    return None
