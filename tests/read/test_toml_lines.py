"""Where each key of a TOML file stands, found without the parser's help."""

from __future__ import annotations

import tomllib
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from shopfloor.read.toml_lines import deep_key, lines_of
from tests.read.reading import patient

HARD = '''# [not.a.table]
a = 1 # = 2
"b.c" . d = """x
 = [ "" y""" # a text of two lines, with quotes

[[machine]]
id = 'A # not a remark'
closed = [ # ]
  { from = 06:00:00, to = "}" },

  { from = 2026-03-02 06:00:00, to.x = ["]", [1,
   2]] },
]
[[machine]]
[[machine.closed]]
[[machine.closed]]
reason = "a \\\\"
[machine.y."q\\u0041"]
z = \'\'\'
\'\'\'
[ shift ]
start = 2026-03-02T06:00:00
'''


def test_every_key_and_element_has_its_line() -> None:
    assert lines_of(HARD) == {
        ("a",): 2,
        ("b.c",): 3,
        ("b.c", "d"): 3,
        ("machine",): 6,
        ("machine", 0): 6,
        ("machine", 0, "id"): 7,
        ("machine", 0, "closed"): 8,
        ("machine", 0, "closed", 0): 9,
        ("machine", 0, "closed", 0, "from"): 9,
        ("machine", 0, "closed", 0, "to"): 9,
        ("machine", 0, "closed", 1): 11,
        ("machine", 0, "closed", 1, "from"): 11,
        ("machine", 0, "closed", 1, "to"): 11,
        ("machine", 0, "closed", 1, "to", "x"): 11,
        ("machine", 0, "closed", 1, "to", "x", 0): 11,
        ("machine", 0, "closed", 1, "to", "x", 1): 11,
        ("machine", 0, "closed", 1, "to", "x", 1, 0): 11,
        ("machine", 0, "closed", 1, "to", "x", 1, 1): 12,
        ("machine", 1): 14,
        ("machine", 1, "closed"): 15,
        ("machine", 1, "closed", 0): 15,
        ("machine", 1, "closed", 1): 16,
        ("machine", 1, "closed", 1, "reason"): 17,
        ("machine", 1, "y"): 18,
        ("machine", 1, "y", "qA"): 18,
        ("machine", 1, "y", "qA", "z"): 19,
        ("shift",): 21,
        ("shift", "start"): 22,
    }


def paths(value: Any, path: tuple[str | int, ...] = ()) -> set[tuple[str | int, ...]]:
    """Every path of a parsed tree but the root."""
    if isinstance(value, dict):
        inner = list(value.items())
    else:
        inner = list(enumerate(value)) if isinstance(value, list) else []
    return {(*path, key) for key, _ in inner}.union(*(paths(entry, (*path, key)) for key, entry in inner))


@pytest.mark.parametrize("end", ["\n", "\r\n"])
def test_the_paths_are_those_of_the_parser(end: str) -> None:
    text = HARD.replace("\n", end)
    assert set(lines_of(text)) == paths(tomllib.loads(text))


_scalar = st.one_of(
    st.integers(), st.booleans(), st.floats(allow_nan=False, allow_infinity=False), st.datetimes(), st.times()
).map(lambda value: value.isoformat() if hasattr(value, "isoformat") else str(value).lower())
_text = st.text(st.characters(codec="utf-8", exclude_characters="\r"), max_size=6).map(
    lambda text: '"' + "".join(c if c.isalnum() else f"\\U{ord(c):08X}" for c in text) + '"'
)
_gap = st.sampled_from(["", " ", "\n", " # ]}=\n", "\n\n\t"])
_space = st.sampled_from(["", " ", "\t"])


@st.composite
def values(draw: st.DrawFn, depth: int = 3) -> str:
    """A TOML value, written with gaps wherever it may have some."""
    kind = draw(
        st.sampled_from(["scalar", "text", "quotes", "list", "table"] if depth else ["scalar", "text"])
    )
    if kind == "list":
        entries = draw(st.lists(values(depth - 1), max_size=3))
        inside = [draw(_gap) + entry + draw(_gap) for entry in entries]
        return "[" + ",".join(inside) + ("," if entries and draw(st.booleans()) else "") + draw(_gap) + "]"
    if kind == "table":
        keys = draw(st.lists(st.sampled_from(["a", "b-1", '"c.d"', "'e\"'"]), max_size=3, unique=True))
        pairs = [f"{draw(_space)}{k}{draw(_space)}={draw(_space)}{draw(values(depth - 1))}" for k in keys]
        return "{" + ",".join(pairs) + "}"
    if kind == "quotes":
        return draw(st.sampled_from(["'''a\n'b''c'''", '"""\n"a""b\\""""""', "'#'", "''", '""', '"\\""']))
    return draw(_scalar if kind == "scalar" else _text)


@patient
@given(st.lists(values(), max_size=4))
def test_any_document_is_walked_as_the_parser_reads_it(written: list[str]) -> None:
    heads = ["[[m]]", "[m.x]", "[[m.y]]", "[[m]]"]
    text = "".join(f"{heads[k]}\nkey = {value}\n" for k, value in enumerate(written))
    lines = lines_of(text)
    assert set(lines) == paths(tomllib.loads(text))
    rows = text.splitlines()
    assert all(rows[lines[path] - 1] for path in lines)


def test_keys_of_very_many_parts_are_found_before_the_parser_meets_them() -> None:
    assert deep_key("a = 1.5\n[x.y.z]\n'a'.\"b\" . c = '....'\n# ......\n") is None
    assert deep_key("a = 1\n" + "b." * 100 + "c = 1") == 7
    assert deep_key("[" + "'b' ." * 100 + "c]") == 5
