"""The rules that only a plan file can break, and how such a fault is added to the list."""

from __future__ import annotations

from typing import Any

from shopfloor.errors import InputError
from shopfloor.model.results import Fault
from shopfloor.read.rules import RULES, Findings, Place, Rule, shorten

PLAN_RULES: dict[str, Rule] = {
    "plan-column-missing": Rule("has no column {name}", "name the columns {needed} in the header"),
    "plan-column-twice": Rule("stands in the header twice", "delete or rename one"),
    "plan-cell-missing": Rule("is empty", "fill in the {name}, or delete the row"),
    "plan-count-unreadable": Rule("is no whole number", "write digits such as 1, or leave it empty"),
    # ---- times
    "time-unreadable": Rule("{problem}", "{advice}"),
    "time-without-hours": Rule("is a date without a time", "write it as {example}"),
    "date-ambiguous": Rule(
        "is a date in a local form, which does not mean the same everywhere",
        "write it as {example}, or save the column as text",
    ),
    "time-12-hour": Rule("is a time on a 12-hour clock", "write it as {example}, or save the column as text"),
    "time-a-number": Rule(
        "is a spreadsheet's number for a time", "write it as {example}, or save the column as date and time"
    ),
    # ---- plan.json
    "json-syntax": Rule("is not valid JSON ({reason})", "save the plan again, or audit its plan.csv"),
    "json-kind": Rule("is {got}, not {wanted}", "write {wanted}"),
    "json-missing": Rule("is missing", "add it; every {what} has one"),
    "json-number-large": Rule("is more than {limit:,}", "correct it"),
    "json-number-far": Rule("is beyond {limit:,} s from the shift's start", "correct it"),
    "json-schema": Rule(
        "is not a version this release reads", "use {known}, or the release that wrote the plan"
    ),
    "json-too-many": Rule("has {count:,} entries, more than {limit:,}", "check that this is the right file"),
    "plan-other-start": Rule(
        "is not the start of this shift, {start}",
        "give the start that the plan was made for, or audit its plan.csv",
    ),
}


def plan_fault(findings: Findings, place: Place, rule: str, value: str = "", **words: Any) -> None:
    """Add one fault of a plan file, of a rule from ``PLAN_RULES`` or one that all files share.

    Those of one row must come in the order of its columns.
    """
    said = PLAN_RULES[rule] if rule in PLAN_RULES else RULES[rule]
    fault = Fault(
        file=place.file,
        sheet=place.sheet,
        row=place.row,
        column=place.column,
        value=shorten(value),
        rule=rule,
        problem=said.problem.format(**words),
        advice=said.advice.format(**words),
    )
    findings.merge(InputError([fault]))
