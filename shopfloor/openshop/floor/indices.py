"""How pressing an operation is that waits: one number, the most pressing first.

All in one currency, so that waiting can be paid in it: an operation that could start only after a wait
loses wait / (patience × mean run time). For the index of apparent tardiness cost, a logarithm, that is the
factor exp(−wait / …) with which such rules charge set-ups (Y. H. Lee, K. Bhaskaran, M. Pinedo, IIE
Transactions 29 (1997) 45-52). To add a rule: one function to a :data:`MakeIndex`, and a line in the grids
of :mod:`shopfloor.openshop.floor.list_rule`.
"""

from __future__ import annotations

from collections.abc import Callable
from math import log

from shopfloor.openshop.floor.rules import Rules

Index = Callable[[int, int], float]  # from an operation and the time now to how pressing it is
MakeIndex = Callable[[Rules, list[int]], Index]  # from a floor and a live list of each order's work left


def usual_s(rules: Rules) -> float:
    """Return the mean run time."""
    return sum(rules.seconds) / max(1, len(rules))


def most_work(longest: float) -> MakeIndex:
    """Return the index of the work an order has left, the operation's own counted `longest` times more."""

    def make(rules: Rules, work: list[int]) -> Index:
        job = rules.job
        own = [longest * log(seconds) for seconds in rules.seconds]

        def index(operation: int, now: int) -> float:
            return log(work[job[operation]]) + own[operation]

        return index

    return make


def apparent_cost(look_ahead: float, flow: float, deadline: int, pull: float) -> MakeIndex:
    """Return the index of apparent tardiness cost, as a logarithm.

    A. P. J. Vepsalainen, T. E. Morton, Management Science 33 (1987) 1035-1047.

    Parameters
    ----------
    look_ahead
        How many mean run times before it becomes urgent an operation counts noticeably.
    flow
        The share of the order's other work that is taken off its slack.
    deadline, pull
        Every order is also due at `deadline`, with the weight `pull` of the heaviest; more than 0.
    """

    def make(rules: Rules, work: list[int]) -> Index:
        job, seconds, due = rules.job, rules.seconds, rules.due
        scale = 1.0 / (look_ahead * usual_s(rules))
        weight = [log(max(1, each)) for each in rules.weight]
        length = [log(each) for each in seconds]
        common = log(pull) + max(weight)

        def index(operation: int, now: int) -> float:
            order = job[operation]
            left, lasts = work[order], seconds[operation]
            slack = due[order] - now - lasts - flow * (left - lasts)
            own = weight[order] - slack * scale if slack > 0 else weight[order]
            room = deadline - now - left
            other = common - room * scale if room > 0 else common
            return (own if own > other else other) - length[operation]

        return index

    return make


def earliest_due(deadline: int) -> MakeIndex:
    """Return the index of the earliest due time, or of `deadline` where that is earlier; then most work."""

    def make(rules: Rules, work: list[int]) -> Index:
        job, scale = rules.job, 1.0 / usual_s(rules)
        due = [min(each, deadline) * scale for each in rules.due]

        def index(operation: int, now: int) -> float:
            order = job[operation]
            return work[order] * scale * 1e-3 - due[order]

        return index

    return make


def modified_due(deadline: int) -> MakeIndex:
    """Return the index of the time to the due time, or of the work left if that is more, over the weight.

    J. J. Kanet, X. Li, Journal of Scheduling 7 (2004) 261-276.
    """

    def make(rules: Rules, work: list[int]) -> Index:
        job, heaviest = rules.job, max(1, *rules.weight)
        due = [min(each, deadline) for each in rules.due]
        factor = [heaviest / max(1, each) / usual_s(rules) for each in rules.weight]

        def index(operation: int, now: int) -> float:
            order = job[operation]
            left, room = work[order], due[order] - now
            return -(left if left > room else room) * factor[order]

        return index

    return make
