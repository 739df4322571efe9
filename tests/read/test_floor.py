"""shop.toml: what is read, and every way of getting it wrong."""

from __future__ import annotations

from typing import Any
from zoneinfo import ZoneInfo

import pytest
from hypothesis import given
from hypothesis import strategies as st

from shopfloor.errors import InputError
from shopfloor.model.results import Fault
from shopfloor.model.shop import Machine
from shopfloor.read.floor import Floor, load_floor
from shopfloor.read.orders import load
from tests.read.reading import patient

WHOLE = """
[shift]
start = 2026-03-02T06:00:00
end = "14:00"
zone = "Europe/London"

[[machine]]
id = "WASH"
name = "Washing bay"
count = 2

[[machine]]
id = " 007 "

[columns]
order = "Work Order No"
"""


def floor(text: str) -> Floor:
    return load_floor(text.encode(), name="shop.toml")


def faults(text: str | bytes) -> tuple[Fault, ...]:
    with pytest.raises(InputError) as caught:
        load_floor(text.encode() if isinstance(text, str) else text, name="shop.toml")
    return caught.value.faults


def test_the_shift_the_machines_and_the_columns() -> None:
    read = floor(WHOLE)
    assert read.clock.zone == ZoneInfo("Europe/London")
    assert read.shift_end_s == 8 * 3600
    assert read.machines == (Machine("WASH", "Washing bay", 2), Machine("007"))
    assert read.columns == {"order": "Work Order No"}


@pytest.mark.parametrize("text", ["# nothing\n", "\ufeff[shift]\n", "[columns]\n"])
def test_every_part_may_be_left_out(text: str) -> None:
    read = floor(text)
    assert (read.clock.start, read.shift_end_s, read.machines, read.columns) == (None, None, (), {})


def test_a_floor_read_once_serves_many_orders() -> None:
    read = floor(WHOLE.replace("[columns]", "").replace('order = "Work Order No"', ""))
    shop = load(b"order,machine\nA,WASH\n", shop=read, start="2026-03-02T13:00").shop
    assert shop.machines == read.machines
    assert shop.shift_end_s == 3600


@pytest.mark.parametrize(
    ("text", "line", "said"),
    [
        (
            "[shift\n",
            1,
            "'[shift' is not valid TOML: expected ']' at the end of a table declaration; correct the line",
        ),
        ("a = 1\nb = \n", 2, "'b =' is not valid TOML: invalid value; correct the line"),
        ("a = 1\na = 2\n", 2, "'a = 2' is not valid TOML: cannot overwrite a value; correct the line"),
        ("a = " + "[" * 5000, 0, "is not valid TOML: nested too deeply; correct the line"),
        (
            "[shift]\n" + "a." * 100_000 + "a = 1\n",
            2,
            f"'{'a.' * 19}a…' is not valid TOML: nested too deeply; correct the line",
        ),
    ],
)
def test_what_is_no_toml_is_shown_with_its_line(text: str, line: int, said: str) -> None:
    (fault,) = faults(text)
    assert (fault.rule, fault.row) == ("toml-syntax", line)
    assert fault.text() == f"shop.toml{f' row {line}' if line else ''}: {said}"


def test_a_file_that_is_no_utf8_or_is_huge() -> None:
    (fault,) = faults(b'[[machine]]\nid = "W\xe4sche"\n')
    assert fault.rule == "encoding-broken"
    (fault,) = faults(b"#" * 300_000)
    assert fault.rule == "file-too-large"


@pytest.mark.parametrize(
    ("text", "line", "said"),
    [
        (
            "[shift]\nstrat = 1\n",
            2,
            "column shift.strat: 'strat' is no key this tool knows; the nearest is 'start'; "
            "correct or delete it; known here: start, end, zone, breaks",
        ),
        (
            "[shitf]\n",
            1,
            "column shitf: 'shitf' is no key this tool knows; the nearest is 'shift'; "
            "correct or delete it; known here: shift, machine, crew, changeover, transport, columns",
        ),
        (
            "[[machine]]\nid = 'A'\n[[machine]]\nid = 'B'\ncolour = 'red'\n",
            5,
            "column machine.colour: 'colour' is no key this tool knows; "
            "correct or delete it; known here: id, name, count, pauses, open, closed, crew, heads, attended, "
            "setup_minutes, family",
        ),
        (
            "[columns]\npriorty = 'P'\n",
            2,
            "column columns.priorty: 'priorty' is no key this tool knows; the nearest is 'priority'; "
            "correct or delete it; known here: order, machine, minutes, quantity, minutes_each, "
            "setup_minutes, release, due, priority, family, step, splittable, heads, note",
        ),
    ],
)
def test_unknown_keys_are_faults_with_the_nearest_known_one(text: str, line: int, said: str) -> None:
    (fault,) = faults(text)
    assert (fault.rule, fault.row) == ("unknown-key", line)
    assert fault.text() == f"shop.toml row {line}, {said}"


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("shift = 1\n", "column shift: '1' is a number, not a table: [shift]"),
        (
            "[shift]\nstart = 6\n",
            "column shift.start: '6' is a number, not a date and time such as \"2026-03-02T06:00\"",
        ),
        ("[shift]\nend = true\n", "column shift.end: 'True' is true or false, not a time such as \"14:00\""),
        ("[shift]\nzone = 1\n", "column shift.zone: '1' is a number, not a text such as \"Europe/London\""),
        ("[machine]\nid = 'A'\n", "column machine: '' is a table, not a list of tables: [[machine]]"),
        ("machine = [1]\n", "column machine: '1' is a number, not a table: [[machine]]"),
        (
            "[[machine]]\nid = 7\n",
            "column machine.id: '7' is a number, not a text in quotes, such as \"CMM\"",
        ),
        (
            "[[machine]]\nid = 'A'\nname = []\n",
            "column machine.name: '' is a list, not a text in quotes, such as \"CMM\"",
        ),
        (
            "[[machine]]\nid = 'A'\ncount = '2'\n",
            "column machine.count: '2' is a text, not a whole number such as 2",
        ),
        (
            "[[machine]]\nid = 'A'\ncount = true\n",
            "column machine.count: 'True' is true or false, not a whole number such as 2",
        ),
        ("columns = 'x'\n", "column columns: 'x' is a text, not a table: [columns]"),
        (
            "[columns]\norder = 7\n",
            "column columns.order: '7' is a number, not a header in quotes, such as \"Work Order No\"",
        ),
    ],
)
def test_values_of_the_wrong_kind(text: str, said: str) -> None:
    (fault,) = faults(text)
    assert fault.rule == "wrong-kind"
    line = text.count("\n")
    assert fault.row in {1, line}
    assert f"{fault.where.partition(', ')[2]}: {fault.value!r} {fault.problem}" == said


@pytest.mark.parametrize("count", ["0", "-1", "1.5", "10001", "nan", "inf"])
def test_a_group_has_a_whole_number_of_units(count: str) -> None:
    (fault,) = faults(f"[[machine]]\nid = 'A'\ncount = {count}\n")
    assert fault.rule == "count-unusable"


@pytest.mark.parametrize(
    ("entry", "code"),
    [
        ("name = 'x'", "key-missing"),
        ("id = ' '", "key-missing"),
        ("id = 'a\\nb'", "control-character"),
        (f"id = '{'x' * 81}'", "name-too-long"),
    ],
)
def test_a_machine_has_a_name_that_can_be_printed(entry: str, code: str) -> None:
    text = f"[[machine]]\n{entry}\n".replace("'a\\nb'", '"a\\nb"')
    assert [fault.rule for fault in faults(text)] == [code]


def test_machines_are_listed_once() -> None:
    (fault,) = faults("[[machine]]\nid = 'A'\n\n[[machine]]\nid = 'A'\n")
    assert fault.rule == "machine-duplicate"
    assert fault.text() == (
        "shop.toml row 5, column machine.id: 'A' is listed twice (first in line 2); "
        "delete one, or use count for identical units"
    )


@pytest.mark.parametrize(
    "zone", ["Europe/Lodnon", "Europe", "../../etc/passwd", "", "/etc/localtime", "a\\u0000b", "CET+1"]
)
def test_zones_are_iana_names(zone: str) -> None:
    (fault,) = faults(f'[shift]\nzone = "{zone}"\n')
    assert fault.rule == "zone-unknown"
    if zone == "Europe/Lodnon":
        assert fault.problem == "is no time zone; the nearest is 'Europe/London'"


def test_columns_are_mapped_to_one_header_each() -> None:
    found = faults("[columns]\norder = 'Work Order No'\ndue = 'work_order-no'\nnote = ' '\n")
    assert [(fault.rule, fault.row) for fault in found] == [("header-mapped-twice", 3), ("header-empty", 4)]


def test_every_fault_of_the_file_comes_in_one_go() -> None:
    found = faults(
        "[shift]\nstrat = 1\nend = 'x'\n[[machine]]\n[[machine]]\nid = 1\n[crew]\n[transport]\nbetwen = 5\n"
    )
    assert [fault.rule for fault in found] == [
        "unknown-key",
        "end-unreadable",
        "key-missing",
        "wrong-kind",
        "wrong-kind",
        "unknown-key",
    ]


_KEYS = [
    "id",
    "a",
    "from",
    "to",
    "pairs",
    "minutes",
    "between",
    "breaks",
    "closed",
    "open",
    "levels",
    "heads",
]
_values = st.recursive(
    st.one_of(
        st.booleans(),
        st.integers(-5, 5),
        st.sampled_from(['"x"', '""', "06:00:00", "2026-03-02", "nan", "1.5"]),
    ),
    lambda inner: st.one_of(
        st.lists(inner, max_size=2), st.dictionaries(st.sampled_from(_KEYS), inner, max_size=3)
    ),
    max_leaves=4,
)


def written(value: Any) -> str:
    if isinstance(value, dict):
        return "{" + ", ".join(f"{key} = {written(entry)}" for key, entry in value.items()) + "}"
    if isinstance(value, list):
        return "[" + ", ".join(map(written, value)) + "]"
    return str(value).lower() if isinstance(value, bool) else str(value)


_tables = st.sampled_from(["shift", "machine", "columns", "crew", "changeover", "transport", "x"])


@patient
@given(st.dictionaries(_tables, _values, max_size=4))
def test_any_toml_gives_a_floor_or_faults(tree: dict[str, Any]) -> None:
    text = "".join(f"{key} = {written(value)}\n" for key, value in tree.items())
    try:
        read = floor(text)
    except InputError as error:
        said = [fault.text() for fault in error.faults]
    else:
        said = [read.draft.file]
    assert all(said)
