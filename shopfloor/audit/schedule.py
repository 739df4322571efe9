"""The audit of a plan: one function a rule, one table of rules, sentences for what is broken.

Nothing here, or in the modules it draws on, comes from the methods or the bounds: the plan is read back
as anybody might have written it, and held against the shop by plain arithmetic.

To add a rule: one function from a :class:`Reading` to :class:`Breaches`, and one line in ``RULES``.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from shopfloor.audit import between, claims, hall, overlap, rounds, rows
from shopfloor.audit.reading import Breaches, Reading
from shopfloor.model.results import Violation
from shopfloor.model.shop import Shop
from shopfloor.model.stated import StatedPlan

MOST_LISTED = 1_000


@dataclass(frozen=True, slots=True)
class Rule:
    """One rule of a plan: the function that finds where it is broken, and the rule in words."""

    find: Callable[[Reading], Breaches]
    says: str


RULES: dict[str, Rule] = {
    "order-unknown": Rule(rows.unknown_orders, "every row's order is in the orders file"),
    "machine-unknown": Rule(rows.unknown_machines, "every row's machine is in the shop"),
    "operation-missing": Rule(rows.missing_operations, "every operation is in the plan"),
    "operation-extra": Rule(rows.extra_rows, "nothing runs unasked or twice"),
    "length": Rule(rows.lengths, "every row ends after it starts"),
    "duration": Rule(rows.durations, "an operation's parts together take its time"),
    "start": Rule(rows.starts, "nothing starts before the shift"),
    "unit": Rule(rows.units, "units count from 1 to as many as the machine has"),
    "order-overlap": Rule(overlap.order_overlaps, "no order is in two places at once"),
    "machine-overlap": Rule(overlap.machine_overlaps, "no unit of a machine runs two orders at once"),
    "release": Rule(overlap.releases, "no order starts before its release"),
    "steps": Rule(overlap.steps, "lower steps of an order finish before higher ones start"),
    "transport": Rule(between.transports, "an order has the time to get to its next machine"),
    "changeover": Rule(between.changeovers, "a unit has the open time to change to the next family"),
    "closure": Rule(hall.closures, "nothing starts, ends or, unless it pauses, runs on while shut"),
    "crew": Rule(hall.crews, "no crew gives more heads than it has"),
    "split": Rule(rows.splits, "only operations that may be split are in parts"),
    "parts": Rule(rows.part_numbers, "parts are numbered by time, 1 to as many as there are"),
    "round-number": Rule(rounds.round_numbers, "rounds count from 1, and all rows have one or none has"),
    "round-start": Rule(rounds.round_starts, "same round, same start, and the other way round"),
    "round-order": Rule(rounds.round_order, "a round starts when the rounds before it have ended"),
    "round-visit": Rule(rounds.round_visits, "one visit an order, one order a unit, in a round"),
    "makespan": Rule(claims.makespan, "the stated makespan is the end of the last row"),
    "bound-unknown": Rule(claims.unknown_bounds, "every stated bound is of a kind the audit knows"),
    "bound-witness": Rule(claims.witnesses, "every witness names what is in the shop, with its true figures"),
    "bound-value": Rule(claims.bound_values, "every bound is what its witness proves"),
    "lower-bound": Rule(claims.lower_bound, "the stated lower bound is the best bound that holds"),
    "bound-above": Rule(claims.bound_above, "no bound that holds lies above the makespan"),
    "optimal": Rule(claims.optimality, "proved optimal only where makespan and bound meet"),
    "shift": Rule(claims.shift_end, "whether the plan fits the shift is stated truly"),
}


def audit(shop: Shop, stated: StatedPlan) -> list[Violation]:
    """Return every violation of the rules, in the order of ``RULES`` and then of the plan's rows.

    Parameters
    ----------
    shop
        What the plan is for.
    stated
        The plan as stated, by hand or by a method; nothing about it is believed.

    Returns
    -------
    An empty list for a clean plan. At most ``MOST_LISTED`` violations, shared out so that every broken
    rule shows; then one with the code ``more`` that counts the rest. O(n log n) for n rows and m
    operations of like number: about as long as sorting them a dozen times.
    """
    reading = Reading(shop, stated)
    found = {code: rule.find(reading) for code, rule in RULES.items()}
    counts = {code: len(breaches) for code, breaches in found.items()}
    shown = _shares(counts)
    listed = [_violation(reading, code, found[code], index) for code in found for index in range(shown[code])]
    rest = {code: counts[code] - shown[code] for code in found if counts[code] > shown[code]}
    return [*listed, _more(rest)] if rest else listed


def _violation(reading: Reading, code: str, found: Breaches, index: int) -> Violation:
    at = found.at[index].tolist()
    rows = [int(reading.stated.row[k]) for k in at if k >= 0] if found.are_rows else []
    return Violation(code, found.say(*at), tuple(dict.fromkeys(rows)))


def _shares(counts: dict[str, int]) -> dict[str, int]:
    """Share the places of the list out: an equal part for every broken rule, the rest in table order."""
    equal = MOST_LISTED // max(1, sum(count > 0 for count in counts.values()))
    shown = {code: min(count, equal) for code, count in counts.items()}
    left = MOST_LISTED - sum(shown.values())
    for code, count in counts.items():
        extra = min(count - shown[code], left)
        shown[code] += extra
        left -= extra
    return shown


def _more(rest: dict[str, int]) -> Violation:
    by_rule = ", ".join(f"{count:,} × {code}" for code, count in rest.items())
    return Violation("more", f"Not listed: {sum(rest.values()):,} more ({by_rule}).")
