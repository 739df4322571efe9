"""plan.json becomes a stated plan: every value is of its kind and size, or it is a fault."""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from shopfloor import settings
from shopfloor.model.calendar import Clock
from shopfloor.model.results import PLAN_SCHEMA, Bound
from shopfloor.model.schedule import NO_ROUND
from shopfloor.model.shop import Ints
from shopfloor.model.stated import StatedPlan
from shopfloor.read import cells as cell
from shopfloor.read.cells import CellFault
from shopfloor.read.plan_rules import plan_fault
from shopfloor.read.plan_times import FAR_S
from shopfloor.read.rules import Findings, Place
from shopfloor.read.source import Source

MAX_BOUNDS = 10_000
MAX_COUNT = 10**9  # of units, rounds and parts

_NULL = type(None)
_KINDS: Mapping[type, str] = {
    dict: "an object",
    list: "a list",
    str: "a text",
    bool: "true or false",
    int: "a whole number",
    float: "a decimal number",
    _NULL: "null",
}


@dataclass(frozen=True, slots=True)
class _Key:
    """What a key holds: values of one of `kinds`, whole numbers no further from zero than `limit`."""

    name: str
    kinds: tuple[type, ...]
    needed: bool = True
    default: Any = None
    limit: int = FAR_S


_CLAIMS = (
    _Key("schema", (int,)),
    _Key("shift_start", (str, _NULL), needed=False),
    _Key("makespan_s", (int, _NULL), needed=False),
    _Key("lower_bound_s", (int, _NULL), needed=False),
    _Key("proved_optimal", (bool, _NULL), needed=False),
    _Key("fits_shift", (bool, _NULL), needed=False),
    _Key("bounds", (list,), needed=False, default=()),
    _Key("assignments", (list,)),
)
_BOUND = (
    _Key("kind", (str,)),
    _Key("value_s", (int,)),
    _Key("witness", (dict,)),
    _Key("sentence", (str,), needed=False, default=""),
)
_ASSIGNMENT = (
    _Key("order", (str,)),
    _Key("machine", (str,)),
    _Key("unit", (int,), needed=False, default=1, limit=MAX_COUNT),
    _Key("start_s", (int,)),
    _Key("end_s", (int,)),
    _Key("round", (int, _NULL), needed=False, limit=MAX_COUNT),
    _Key("part", (int,), needed=False, default=1, limit=MAX_COUNT),
    _Key("parts", (int,), needed=False, default=1, limit=MAX_COUNT),
)


def is_json(source: Source) -> bool:
    """Whether the first visible character opens a JSON object or list, in any Unicode encoding."""
    start = source.data[:64].replace(b"\0", b"").lstrip(b"\xef\xbb\xbf\xff\xfe \t\r\n")
    return start[:1] in (b"{", b"[")


def read_plan_json(source: Source, clock: Clock, findings: Findings) -> StatedPlan:
    """Read plan.json.

    Parameters
    ----------
    clock
        Of the shop; the plan must count its seconds from the same start.

    Raises
    ------
    InputError
        With every fault; in it `row` counts the assignments from 1. O(n) for n of them.
    """
    whole = _parse(source, findings)
    findings.stop_if_any()
    reader = _Reader(source.place, findings)
    version = whole.get("schema") if isinstance(whole, dict) else None
    if type(version) is int and version != PLAN_SCHEMA:
        place = source.place.at(0, "schema")
        plan_fault(findings, place, "json-schema", str(version), known=PLAN_SCHEMA)
        findings.stop_if_any()  # the rest may mean something else
    plan = reader.columns("", [whole], _CLAIMS)
    findings.stop_if_any()
    claims = {name: value for name, [value] in plan.items()}
    _compare_start(whole, clock, source.place, findings)
    bounds = reader.columns("bounds", claims["bounds"], _BOUND, MAX_BOUNDS)
    rows: dict[str, Any] = reader.columns(
        "assignments", claims["assignments"], _ASSIGNMENT, settings.MAX_ROWS
    )
    for name in ("order", "machine"):
        reader.check_names(name, rows[name])
    findings.stop_if_any()
    rows["round"] = [NO_ROUND if rank is None else rank for rank in rows["round"]]
    return StatedPlan(
        row=_numbered(rows["order"]),
        makespan_s=claims["makespan_s"],
        lower_bound_s=claims["lower_bound_s"],
        proved_optimal=claims["proved_optimal"],
        fits_shift=claims["fits_shift"],
        bounds=tuple(map(Bound, *(bounds[key.name] for key in _BOUND))),
        **rows,
    )


def _numbered(rows: Sequence[Any]) -> Ints:
    return np.arange(1, len(rows) + 1)


def _parse(source: Source, findings: Findings) -> Any:
    """Return the document; what is not JSON, or has one key twice or a NaN in it, becomes a fault."""
    try:
        return json.loads(source.data, object_pairs_hook=_once, parse_constant=_refuse_constant)
    except RecursionError:
        reason = "it is nested too deeply"
    except json.JSONDecodeError as error:
        reason = f"{error.msg.lower()}, line {error.lineno}"
    except UnicodeDecodeError as error:
        reason = f"byte {error.start + 1:,} is not {error.encoding.upper()}"
    except ValueError as error:  # from the two below, or a number with thousands of digits
        reason = str(error).partition(";")[0].lower()
    plan_fault(findings, source.place, "json-syntax", reason=reason)
    return None


def _once(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    found = dict(pairs)
    if len(found) < len(pairs):
        keys = [key for key, _ in pairs]
        again = next(key for place, key in enumerate(keys) if key in keys[:place])
        raise ValueError(f"the key {again[:40]!r} stands in one object twice")
    return found


def _refuse_constant(text: str) -> Any:
    raise ValueError(f"{text} is no number")


def _compare_start(whole: Mapping[str, Any], clock: Clock, place: Place, findings: Findings) -> None:
    """A plan counts its seconds from its own shift's start, which must be this one."""
    here = clock.write(0) if clock.running else None
    if "shift_start" in whole and whole["shift_start"] != here:
        value, start = _text(whole["shift_start"]), here or "which is not known"
        plan_fault(findings, place.at(0, "shift_start"), "plan-other-start", value, start=start)


def _text(value: Any) -> str:
    return value if isinstance(value, str) else json.dumps(value, default=str)[:60]


class _Reader:
    """Reads lists of like objects a column at a time, so that a sound file costs little more than parsing."""

    def __init__(self, place: Place, findings: Findings) -> None:
        self.place = place
        self.findings = findings

    def columns(
        self, what: str, items: Sequence[Any], keys: Sequence[_Key], limit: int = 1
    ) -> dict[str, list[Any]]:
        """Return the values of each key, an entry an item; a wrong or missing one becomes a fault."""
        if len(items) > limit:
            place = self.place.at(0, what)
            plan_fault(self.findings, place, "json-too-many", count=len(items), limit=limit)
            items = ()
        strangers = [index for index, item in enumerate(items) if type(item) is not dict]
        if strangers:
            self._each(
                strangers, lambda index: self._kind(self._at(index, what, what), items[index], (dict,))
            )
            items = ()
        return {key.name: self._column(what, items, key) for key in keys}

    def _column(self, what: str, items: Sequence[Mapping[str, Any]], key: _Key) -> list[Any]:
        values = [item.get(key.name, key.default) for item in items]
        fine = set(key.kinds) if key.needed else {*key.kinds, type(key.default)}
        numbers = [value for value in values if type(value) is int]
        if set(map(type, values)) <= fine and max(map(abs, numbers), default=0) <= key.limit:
            return values
        wrong = [index for index, item in enumerate(items) if self._is_wrong(item, key)]
        self._each(
            wrong, lambda index: self._report(self._at(index, key.name, what), what, items[index], key)
        )
        return values

    @staticmethod
    def _is_wrong(item: Mapping[str, Any], key: _Key) -> bool:
        if key.name not in item:
            return key.needed
        value = item[key.name]
        return type(value) not in key.kinds or (type(value) is int and abs(value) > key.limit)

    def _report(self, place: Place, what: str, item: Mapping[str, Any], key: _Key) -> None:
        if key.name not in item:
            owner = what.removesuffix("s") or "plan"
            plan_fault(self.findings, place, "json-missing", what=owner)
        elif type(item[key.name]) not in key.kinds:
            self._kind(place, item[key.name], key.kinds)
        else:
            rule = "json-number-far" if key.name.endswith("_s") else "json-number-large"
            plan_fault(self.findings, place, rule, _text(item[key.name]), limit=key.limit)

    def _kind(self, place: Place, value: Any, kinds: tuple[type, ...]) -> None:
        wanted = " or ".join(_KINDS[kind] for kind in kinds)
        got = _KINDS.get(type(value), "something else")
        plan_fault(self.findings, place, "json-kind", _text(value), got=got, wanted=wanted)

    def check_names(self, name: str, values: Sequence[str]) -> None:
        """Names are one visible line each, as in every file."""
        reasons: dict[str, CellFault] = {}
        for text in {text for text in values if isinstance(text, str)}:
            try:
                if not text:
                    raise CellFault("plan-cell-missing", name=name)
                cell.name_of(text)
            except CellFault as fault:
                reasons[text] = fault
        if not reasons:
            return

        def add(index: int) -> None:
            fault = reasons[values[index]]
            plan_fault(self.findings, self._at(index, name), fault.rule, values[index], **fault.words)

        self._each([index for index, text in enumerate(values) if text in reasons], add)

    def _each(self, wrong: list[int], add: Callable[[int], None]) -> None:
        self.findings.each(wrong, len(wrong), add)

    def _at(self, index: int, name: str, what: str = "assignments") -> Place:
        """The place of one value; those of the plan itself and of its bounds say so, and have no row."""
        if not what:
            return self.place.at(0, name)
        if what == "bounds":
            return self.place.at(0, f"{what}[{index + 1}]" if name == what else f"{what}[{index + 1}].{name}")
        return self.place.at(index + 1, name)
