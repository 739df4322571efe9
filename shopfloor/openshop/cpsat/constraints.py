"""The rules of the floor as constraints: one function a rule, one table of rules.

To add a rule: one function from a :class:`Model`, and a line in ``RULES``.
"""

from __future__ import annotations

from collections.abc import Callable
from itertools import pairwise

from shopfloor.model.shop import NO_STEP
from shopfloor.openshop.cpsat.variables import Model

Rule = Callable[[Model], None]


def one_at_a_time(model: Model) -> None:
    """An order is in one place, and a machine of one unit runs one operation."""
    for line in model.lines:
        model.cp.add_no_overlap([model.interval[operation] for operation in line])


def as_many_as_units(model: Model) -> None:
    """A group runs no more operations at once than it has units; which unit takes which is found later."""
    for machine, members, staying in model.groups:
        intervals = [model.interval[operation] for operation in members] + staying
        count = model.shop.machines[machine].count
        if len(intervals) > count:
            model.cp.add_cumulative(intervals, [1] * len(intervals), count)


def lower_steps_first(model: Model) -> None:
    """Lower steps of an order finish before higher ones start."""
    columns = model.shop.operations
    stepped: dict[int, dict[int, list[int]]] = {}
    for operation in model.rows:
        if columns.step[operation] != NO_STEP:
            by_step = stepped.setdefault(int(columns.job[operation]), {})
            by_step.setdefault(int(columns.step[operation]), []).append(operation)
    for by_step in stepped.values():
        ranks = [by_step[step] for step in sorted(by_step)]
        for before, after in pairwise(ranks):
            if len(before) * len(after) <= len(before) + len(after):
                for first in before:
                    for second in after:
                        model.cp.add(model.end(first) <= model.start[second])
                continue
            between = model.cp.new_int_var(0, model.latest, "")
            for first in before:
                model.cp.add(model.end(first) <= between)
            for second in after:
                model.cp.add(between <= model.start[second])


RULES: tuple[Rule, ...] = (one_at_a_time, as_many_as_units, lower_steps_first)


def add_rules(model: Model, *, without: tuple[Rule, ...] = ()) -> None:
    """Add every rule but those in `without`."""
    for rule in RULES:
        if rule not in without:
            rule(model)
