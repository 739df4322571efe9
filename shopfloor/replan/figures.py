"""Figures that ISO 22400-2:2014 defines, under its names and by its formulas. Pure.

Source: ISO 22400-2:2014, Automation systems and integration - Key performance indicators (KPIs) for
manufacturing operations management - Part 2: Definitions and descriptions. Names and formulas stand here
from memory, not quoted; hold them against the standard before anything depends on them.

Its times, and what they are made from here, for one work unit (a machine; a group sums its units):

=====  ==============================  =====================================================
PBT    planned busy time               the time the unit is open: without breaks and closures
AUST   actual unit setup time          set-up worked; of each operation begun the planned set-up
APT    actual production time          work without set-up
AUPT   actual unit processing time     APT + AUST
ADET   actual unit delay time          an order is on the unit, and it is down or the work stopped
AUBT   actual unit busy time           AUPT + ADET
ADOT   actual unit down time           the unit is available and executes no order: it is idle
=====  ==============================  =====================================================

An outage without an order on the unit is in none of these: the unit is then neither busy nor available. It
lies in PBT, so that it lowers availability. The standard's "down time" is thus not what a hall calls down.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

SOURCE = "ISO 22400-2:2014; names and formulas from memory, not quoted"
NOTES = (
    "Set-up is not recorded by itself: of each operation begun its planned set-up is taken. An outage "
    "without an order on the machine counts in PBT alone; the standard's down time (ADOT) is time in which "
    "a machine could have run and did not."
)


@dataclass(frozen=True, slots=True)
class Elements:
    """The times of one work unit, in seconds, and its quantities, under the standard's symbols."""

    PBT: int = 0
    AUST: int = 0
    APT: int = 0
    ADET: int = 0
    ADOT: int = 0
    GQ: int = 0
    SQ: int = 0

    @property
    def AUPT(self) -> int:  # noqa: N802 - the standard's symbol
        """Actual unit processing time."""
        return self.APT + self.AUST

    @property
    def AUBT(self) -> int:  # noqa: N802
        """Actual unit busy time."""
        return self.AUPT + self.ADET

    @property
    def PQ(self) -> int:  # noqa: N802
        """Produced quantity: good and scrapped pieces, as far as they were reported."""
        return self.GQ + self.SQ

    def __add__(self, other: Elements) -> Elements:
        names = ("PBT", "AUST", "APT", "ADET", "ADOT", "GQ", "SQ")
        return Elements(*(getattr(self, name) + getattr(other, name) for name in names))


@dataclass(frozen=True, slots=True)
class Figure:
    """One figure: its name in the standard, its formula in words, how it is computed."""

    name: str
    formula: str
    parts: Callable[[Elements], tuple[int, int]]

    def of(self, times: Elements) -> float | None:
        """Return the value; None where it would divide by zero."""
        above, below = self.parts(times)
        return above / below if below else None


FIGURES: Mapping[str, Figure] = {
    "availability": Figure("availability", "APT / PBT", lambda t: (t.APT, t.PBT)),
    "allocation_efficiency": Figure("allocation efficiency", "AUBT / PBT", lambda t: (t.AUBT, t.PBT)),
    "utilization_efficiency": Figure("utilization efficiency", "APT / AUBT", lambda t: (t.APT, t.AUBT)),
    "setup_ratio": Figure("setup ratio", "AUST / AUPT", lambda t: (t.AUST, t.AUPT)),
    "technical_efficiency": Figure(
        "technical efficiency", "APT / (APT + ADET)", lambda t: (t.APT, t.APT + t.ADET)
    ),
    "scrap_ratio": Figure("scrap ratio", "SQ / PQ", lambda t: (t.SQ, t.PQ)),
}
TIMES: Mapping[str, str] = {
    "PBT": "planned busy time",
    "AUST": "actual unit setup time",
    "APT": "actual production time",
    "AUPT": "actual unit processing time",
    "ADET": "actual unit delay time",
    "AUBT": "actual unit busy time",
    "ADOT": "actual unit down time",
}
