"""The list of faults: stable codes, file order, and a bound on its length."""

from __future__ import annotations

import re
import string

import pytest

from shopfloor.errors import InputError
from shopfloor.read.rules import MAX_FAULTS, NOTICES, RULES, Findings, Place, Rule, count_of, refuse, shorten

EVERY = {**RULES, **NOTICES}


@pytest.mark.parametrize("code", EVERY)
def test_codes_are_kebab_case_and_texts_are_half_sentences(code: str) -> None:
    rule = EVERY[code]
    assert re.fullmatch(r"[a-z]+(-[a-z]+)*", code)
    for text in rule:
        assert text
        assert not text.endswith(".")
        assert text[0] in "{(" or not text[0].isupper()


def test_a_code_is_a_fault_or_a_notice_and_never_both() -> None:
    assert not RULES.keys() & NOTICES.keys()


def test_faults_come_in_the_order_of_files_rows_and_columns_however_they_were_found() -> None:
    findings = Findings()
    second, first = Place("a.csv"), Place("b.csv")
    findings.fault(first.at(3, "due", 4), "machine-missing")
    findings.fault(second.at(1, "due", 4), "machine-missing")
    findings.fault(first.at(3, "order", 1), "order-missing")
    findings.fault(first.at(2, "due", 4), "order-missing")
    found = [(fault.file, fault.row, fault.column) for fault in findings.faults]
    assert found == [("b.csv", 2, "due"), ("b.csv", 3, "order"), ("b.csv", 3, "due"), ("a.csv", 1, "due")]


def test_beyond_two_thousand_faults_only_their_number_is_told() -> None:
    findings = Findings()
    place = Place("orders.csv")
    calls = []

    def add(index: int) -> None:
        calls.append(index)
        findings.fault(place.at(index, "minutes", 3), "minutes-missing")

    findings.each(range(2, 1_000_002), 1_000_000, add)
    findings.each(range(1), 1, lambda _: findings.fault(place.at(1), "no-rows"))
    faults = findings.faults
    assert len(calls) == MAX_FAULTS
    assert len(faults) == MAX_FAULTS + 1
    assert faults[0].rule == "no-rows"
    assert faults[-1].rule == "more-faults"
    assert faults[-1].text() == (
        "orders.csv: 998,001 more faults are not listed; correct these first, then read the file again"
    )


def test_faults_added_one_by_one_are_bounded_too() -> None:
    findings = Findings()
    for row in range(1, 10_001):
        findings.fault(Place("orders.csv", row=row), "stray-quote")
    assert findings.count == 10_000
    assert findings.faults[-1].problem == "8,000 more faults are not listed"


def test_an_error_carries_the_notices_beside_the_faults() -> None:
    findings = Findings()
    findings.notice(Place("orders.csv"), "rows-above-header", row=3)
    findings.stop_if_any()  # a notice alone stops nothing
    findings.fault(Place("orders.csv"), "file-empty")
    with pytest.raises(InputError) as caught:
        findings.stop_if_any()
    assert [notice.rule for notice in caught.value.notices] == ["rows-above-header"]


def test_words_from_a_file_are_cut_and_never_read_as_a_template() -> None:
    findings = Findings()
    hostile = "{problem.__class__}" * 10
    findings.fault(Place("orders.csv").at(4, "due", 2), "due-differs", hostile, first=hostile, row=2)
    (fault,) = findings.faults
    assert fault.value == shorten(hostile)
    assert len(fault.value) == 40
    assert fault.problem == f"differs from {shorten(hostile)!r} in row 2 of the same order"


def test_every_word_of_a_rule_is_a_plain_name() -> None:
    for rule in (*EVERY.values(), Rule("", "")):
        for text in rule:
            assert all(
                name is None or name.isidentifier() for _, name, _, _ in string.Formatter().parse(text)
            )


def test_refuse_makes_an_error_of_one_fault() -> None:
    error = refuse(Place("orders.csv"), "file-empty")
    assert str(error) == "orders.csv: is empty; export it again"


def test_counts_agree_with_their_verbs() -> None:
    assert count_of(1, "row repeats", "rows repeat") == "1 row repeats"
    assert count_of(1200, "row repeats", "rows repeat") == "1,200 rows repeat"
