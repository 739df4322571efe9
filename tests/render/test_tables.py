"""plan.json and plan.csv: exact text, exact names, nothing lost and nothing a spreadsheet would run."""

from __future__ import annotations

import csv
import io
import json
import re
from dataclasses import replace
from pathlib import Path
from typing import Any
from zoneinfo import ZoneInfo

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from shopfloor import __version__
from shopfloor.model.calendar import Clock
from shopfloor.model.results import Bound
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Machine, Operations, Orders, Shop
from shopfloor.model.stated import state
from shopfloor.render.tables import harmless, plan_csv, plan_id, plan_json, summary
from tests.render.expected import START, assert_golden, round_plan, small_plan
from tests.render.plans import HOSTILE, hall_plan

SCHEMA = json.loads((Path(__file__).parents[2] / "data" / "plan.schema.json").read_text(encoding="utf-8"))
TYPES = {"object": dict, "array": list, "string": str, "integer": int, "boolean": bool, "null": type(None)}


def faults(value: Any, schema: dict, place: str = "plan") -> list[str]:
    """Check the words of JSON Schema that data/plan.schema.json uses, and refuse any other."""
    known = {"$schema", "title", "description", "type", "const", "enum", "pattern", "minimum", "required"}
    known |= {"properties", "additionalProperties", "items"}
    assert not schema.keys() - known, f"the checker does not know {schema.keys() - known}"
    found = []
    names = schema.get("type", [])
    names = [names] if isinstance(names, str) else names
    is_true_type = [
        isinstance(value, TYPES[name]) and not (name == "integer" and isinstance(value, bool))
        for name in names
    ]
    if names and not any(is_true_type):
        return [f"{place}: {value!r} is no {names}"]
    if "const" in schema and value != schema["const"]:
        found.append(f"{place}: not {schema['const']}")
    if "enum" in schema and value not in schema["enum"]:
        found.append(f"{place}: {value!r} is none of {schema['enum']}")
    if "pattern" in schema and isinstance(value, str) and not re.search(schema["pattern"], value):
        found.append(f"{place}: {value!r} does not match")
    if "minimum" in schema and isinstance(value, int) and value < schema["minimum"]:
        found.append(f"{place}: {value} is below {schema['minimum']}")
    if isinstance(value, dict):
        found += [f"{place}: no {name}" for name in schema.get("required", []) if name not in value]
        others = schema.get("additionalProperties", True)
        for name, item in value.items():
            inner = schema.get("properties", {}).get(name, others)
            if inner is False:
                found.append(f"{place}: unknown {name}")
            elif isinstance(inner, dict):
                found += faults(item, inner, f"{place}.{name}")
    if isinstance(value, list) and "items" in schema:
        found += [fault for item in value for fault in faults(item, schema["items"], f"{place}[]")]
    return found


def read_csv(text: str) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(text.removeprefix("\ufeff"), newline="")))


def disarmed(cell: str) -> str:
    """The inverse of `harmless`, as its docstring tells a reader to write it."""
    return cell[1:] if re.match(r"'+[=+\-@\t\r\n＝＋－＠]", cell) else cell


# ---- exact content -------------------------------------------------------------------------------


def test_json_matches_the_expected_file():
    assert_golden("plan.json", plan_json(small_plan()).replace(__version__, "VERSION"))


def test_csv_matches_the_expected_file():
    assert_golden("plan.csv", plan_csv(small_plan()))


def test_rounds_are_numbered_and_time_counts_from_zero():
    rows = read_csv(plan_csv(round_plan()))
    assert rows[0] == {
        "order": "TQ-1",
        "machine": "Bench 1",
        "unit": "1",
        "start": "0:00:00",
        "end": "0:30:00",
        "round": "1",
        "part": "1",
        "parts": "1",
        "note": "",
    }
    data = json.loads(plan_json(round_plan()))
    assert (data["shift_start"], data["shift_end"], data["shift_end_s"]) == (None, None, None)
    assert [row["round"] for row in data["assignments"][:3]] == [1, 2, 2]


@pytest.mark.parametrize(
    "plan",
    [
        small_plan(),
        round_plan(),
        hall_plan(60, names=HOSTILE),
        hall_plan(60, clock=Clock(), shift_end_s=None),
    ],
    ids=["small", "rounds", "hostile", "without a clock"],
)
class TestEveryPlan:
    def test_json_follows_its_published_schema(self, plan):
        assert faults(json.loads(plan_json(plan)), SCHEMA) == []

    def test_summary_is_the_same_object_without_the_assignments(self, plan):
        data = json.loads(plan_json(plan))
        assert list(data)[-1] == "assignments"
        del data["assignments"]
        assert data == json.loads(json.dumps(summary(plan)))
        assert list(data) == list(summary(plan))

    def test_json_states_every_assignment(self, plan):
        stated = state(plan)
        rows = json.loads(plan_json(plan))["assignments"]
        assert [row["order"] for row in rows] == list(stated.order)
        assert [row["machine"] for row in rows] == list(stated.machine)
        for name in ("unit", "start_s", "end_s", "part", "parts"):
            assert [row[name] for row in rows] == getattr(stated, name).tolist()
        assert [-1 if row["round"] is None else row["round"] for row in rows] == stated.round.tolist()

    def test_csv_states_every_assignment_in_the_same_order(self, plan):
        stated = state(plan)
        rows = read_csv(plan_csv(plan))
        assert [disarmed(row["order"]) for row in rows] == list(stated.order)
        assert [disarmed(row["machine"]) for row in rows] == list(stated.machine)
        clock = plan.shop.clock
        assert [row["start"] for row in rows] == [clock.write(int(moment)) for moment in stated.start_s]
        notes = plan.shop.operations.notes
        assert [disarmed(row["note"]) for row in rows] == [
            notes.get(index, "") for index in plan.schedule.operation.tolist()
        ]

    def test_same_plan_same_text(self, plan):
        assert plan_json(plan) == plan_json(replace(plan))
        assert plan_csv(plan) == plan_csv(replace(plan))


# ---- the schema file itself ----------------------------------------------------------------------


def test_the_schema_check_notices_what_it_should():
    data = json.loads(plan_json(small_plan()))
    data["schema"] = 2
    data["surprise"] = 1
    data["assignments"][0]["unit"] = 0
    data["fits_shift"] = "no"
    del data["seed"]
    assert faults(data, SCHEMA) == [
        "plan: no seed",
        "plan.schema: not 1",
        "plan.fits_shift: 'no' is no ['boolean', 'null']",
        "plan.assignments[].unit: 0 is below 1",
        "plan: unknown surprise",
    ]


# ---- details ---------------------------------------------------------------------------------------


def test_one_assignment_a_line():
    text = plan_json(hall_plan(60))
    assert sum(line.startswith('    {"order"') for line in text.splitlines()) == 60


def test_empty_plan():
    shop = Shop(machines=(), orders=Orders(()), operations=Operations([], [], []))
    plan = replace(small_plan(), shop=shop, schedule=Schedule([], [], []), bounds=(), inputs=(), remarks=())
    data = json.loads(plan_json(plan))
    assert faults(data, SCHEMA) == []
    assert (data["assignments"], data["makespan_s"], data["bounds"]) == ([], 0, [])
    assert plan_csv(plan) == "order,machine,unit,start,end,round,part,parts,note\n"


def test_time_zone_is_named_and_written_times_are_local():
    """On 29 March 2026 the clocks of Oslo go from 02:00 to 03:00."""
    clock = Clock(START.replace(month=3, day=28, hour=22), ZoneInfo("Europe/Oslo"))
    data = json.loads(plan_json(round_plan(machines=12, clock=clock)))
    assert (data["shift_start"], data["time_zone"]) == ("2026-03-28T22:00:00", "Europe/Oslo")
    rows = read_csv(plan_csv(round_plan(machines=12, clock=clock)))
    assert [row["start"][11:] for row in rows if row["order"] == "TQ-1"][7:10] == [
        "01:30:00",
        "03:00:00",
        "03:30:00",
    ]


def test_witness_values_of_numpy_become_plain_numbers():
    witness = {
        "machines": ("A", "B"),
        "load_s": np.array([1, 2]),
        "at_s": np.int64(3),
        "tight": np.bool_(True),
    }
    plan = replace(small_plan(), bounds=(Bound("window", 5100, witness, "A sentence."),))
    assert json.loads(plan_json(plan))["bounds"][0]["witness"] == {
        "machines": ["A", "B"],
        "load_s": [1, 2],
        "at_s": 3,
        "tight": True,
    }


def test_a_bound_that_is_no_number_is_a_bug_and_no_file():
    plan = replace(small_plan(), bounds=(Bound("solver", 5100, {"value": float("nan")}, "A sentence."),))
    with pytest.raises(ValueError, match="not JSON compliant"):
        plan_json(plan)


def test_plan_id_is_how_the_checksum_of_the_file_begins():
    assert plan_id("shopfloor\n") == "8e9db0c9"  # as sha256sum prints it
    assert plan_id(plan_json(small_plan())) != plan_id(plan_json(round_plan()))


def test_byte_order_mark_only_where_text_is_not_ascii():
    assert not plan_csv(round_plan()).startswith("\ufeff")
    assert plan_csv(small_plan()).startswith("\ufefforder,")


@given(st.text(alphabet="'=+-@\t\r\n＝a1 ", max_size=6))
def test_harmless_hides_every_formula_and_loses_nothing(text):
    cell = harmless(text)
    assert cell[:1] not in set("=+-@\t\r\n＝＋－＠")
    assert disarmed(cell) == text


@given(
    st.lists(st.text(alphabet=st.characters(codec="utf-8"), min_size=1, max_size=12), min_size=1, unique=True)
)
def test_any_name_comes_back_from_csv(names):
    shop = Shop(
        machines=(Machine("M"),),
        orders=Orders(tuple(names)),
        operations=Operations(np.arange(len(names)), np.zeros(len(names)), np.full(len(names), 60)),
    )
    starts = np.arange(len(names)) * 60
    plan = replace(small_plan(), shop=shop, schedule=Schedule(np.arange(len(names)), starts, starts + 60))
    rows = read_csv(plan_csv(plan))
    assert [disarmed(row["order"]) for row in rows] == names
    assert [row["order"] for row in json.loads(plan_json(plan))["assignments"]] == names
