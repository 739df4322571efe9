"""Tables: where each cell stands, and columns that hold every distinct text once."""

from __future__ import annotations

import csv
import io

import pandas as pd
from hypothesis import given
from hypothesis import strategies as st

from shopfloor.read import table as tables
from shopfloor.read.headers import Wanted
from shopfloor.read.rules import Findings
from shopfloor.read.table import gather, is_frame, open_table
from tests.read.reading import patient

WANTED = Wanted(("order", "machine"), ("order", "machine"))


def opened(text: str) -> tuple[tables.Table, Findings]:
    findings = Findings()
    return open_table(text.encode(), WANTED, findings, name="t.csv"), findings


def test_a_table_knows_its_header_its_separator_and_where_its_cells_stand() -> None:
    table, _ = opened("\n Order ;Machine\n;\n A;M\n")
    assert table.header == ("Order", "Machine")
    assert (table.separator, table.place.row) == (";", 2)
    assert list(table.records) == [(3, ["", ""]), (4, ["A", "M"])]
    assert (table.at(4, 1).row, table.at(4, 1).column) == (4, "Machine")


def test_short_rows_are_blank_to_their_right_and_long_ones_are_faults() -> None:
    table, findings = opened("order,machine,,\nA\nB,M\nC,M,,x\nD,M,,,,,\n")
    cells = gather(table, {"order": 0, "machine": 1}, findings)
    assert [cells.columns["machine"].text(k) for k in range(4)] == ["", "M", "M", "M"]
    assert [(fault.rule, fault.row, fault.column) for fault in findings.faults] == [("row-too-wide", 4, "D")]


def test_columns_beyond_the_alphabet_are_called_as_a_spreadsheet_does() -> None:
    table, findings = opened("order,machine\nA,M" + "," * 700 + "x\n")
    gather(table, {}, findings)
    assert findings.faults[0].column == "ZZ"


_texts = st.text(st.sampled_from("ab \t\n,é"), max_size=3)


@patient
@given(st.lists(st.tuples(_texts, _texts), max_size=600), st.integers(1, 300))
def test_gathering_keeps_every_row_that_is_not_blank(rows: list[tuple[str, str]], chunk: int) -> None:
    """Whatever the size of the chunks in which rows are taken."""
    out = io.StringIO(newline="")
    csv.writer(out).writerows([("order", "machine"), *rows])
    findings = Findings()
    table = open_table(out.getvalue().encode(), WANTED, findings)
    before, tables.CHUNK = tables.CHUNK, chunk
    try:
        cells = gather(table, {"machine": 1, "order": 0}, findings)
    finally:
        tables.CHUNK = before
    kept = [(k, a.strip(), b.strip()) for k, (a, b) in enumerate(rows, start=2) if a.strip() or b.strip()]
    order, machine = cells.columns["order"], cells.columns["machine"]
    assert [(int(cells.row[k]), order.text(k), machine.text(k)) for k in range(len(cells))] == kept
    assert findings.count == 0


def test_a_frame_is_known_for_what_it_is() -> None:
    assert is_frame(pd.DataFrame())
    assert not is_frame(b"order,machine")
    assert not is_frame({"order": []})
