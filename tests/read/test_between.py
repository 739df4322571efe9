"""Changeovers and transport in shop.toml, and the families of the orders."""

from __future__ import annotations

import pytest

from shopfloor.errors import InputError
from shopfloor.model.results import Fault
from shopfloor.model.shop import NO_FAMILY, Changeovers, Transport
from shopfloor.read.between import MAX_NAMES
from shopfloor.read.floor import Floor, load_floor
from tests.read.reading import notices_of, reading

LISTED = "[[machine]]\nid = 'COAT'\n[[machine]]\nid = 'WASH'\n[[machine]]\nid = 'CMM'\n"
ORDERS = "order,machine,minutes,family\nA,COAT,5,red\nB,COAT,5,black\nC,WASH,5,\n"


def floor(text: str) -> Floor:
    return load_floor((LISTED + text).encode(), name="shop.toml")


def faults(text: str) -> list[Fault]:
    with pytest.raises(InputError) as caught:
        floor(text)
    return list(caught.value.faults)


def pair(one: str, two: str, minutes: float) -> str:
    return f"{{ from = '{one}', to = '{two}', minutes = {minutes} }}"


def test_minutes_between_families_and_machines() -> None:
    read = floor(
        f"[changeover.COAT]\nbetween = 15\n"
        f"pairs = [{pair('red', 'black', 5)}, {pair('black', 'red', 22.5)}]\n"
        f"[transport]\npairs = [{pair('WASH', 'CMM', 0)}]\nbetween = 2\n"
    )
    assert read.changeovers == {"COAT": Changeovers(900, {("red", "black"): 300, ("black", "red"): 1350})}
    assert read.transport == Transport(120, {("WASH", "CMM"): 0})


def test_tables_may_say_as_little_as_they_like() -> None:
    read = floor("[changeover.COAT]\n[changeover.'WASH']\nbetween = 5\n[transport]\n")
    assert read.changeovers == {"COAT": Changeovers(), "WASH": Changeovers(300)}
    assert read.transport.none


def test_they_arrive_in_the_shop() -> None:
    text = f"{LISTED}[changeover.COAT]\nbetween = 15\n[transport]\nbetween = 5\n"
    found = reading(ORDERS, shop=text)
    assert found.shop.changeovers == {"COAT": Changeovers(900)}
    assert found.shop.transport == Transport(300)
    assert found.shop.families == ("red", "black")
    assert found.shop.operations.family.tolist() == [0, 1, NO_FAMILY]
    assert found.notices == ()


@pytest.mark.parametrize(
    ("text", "rule", "line", "column"),
    [
        ("[changeover]\nCOAT = 15\n", "wrong-kind", 8, "changeover.COAT"),
        ("[changeover.COAT]\nbetwen = 15\n", "unknown-key", 8, "changeover.COAT.betwen"),
        ("[changeover.COAT]\nbetween = '15'\n", "wrong-kind", 8, "changeover.COAT.between"),
        ("[changeover.COAT]\nbetween = -1\n", "minutes-unusable", 8, "changeover.COAT.between"),
        ("[changeover.COAT]\npairs = 5\n", "wrong-kind", 8, "changeover.COAT.pairs"),
        ("[changeover.COAT]\npairs = [\n 5 ]\n", "wrong-kind", 9, "changeover.COAT.pairs[1]"),
        (
            "[changeover.COAT]\npairs = [{ from = '', to = 'b', minutes = 1 }]\n",
            "key-missing",
            8,
            "changeover.COAT.pairs[1].from",
        ),
        (
            f"[transport]\npairs = [\n{pair('WASH', 'CMM', 1)},\n{pair('WASH', 'CMM', 2)}]\n",
            "pair-twice",
            10,
            "transport.pairs[2]",
        ),
        (
            f"[transport]\npairs = [{pair('WASH', 'WASH', 1)}]\n",
            "pair-to-itself",
            8,
            "transport.pairs[1]",
        ),
        (
            f"[transport]\npairs = [{pair('WASH', 'WASCH', 0)}]\n",
            "machine-not-listed",
            8,
            "transport.pairs[1].to",
        ),
        ("[changeover.COATS]\n", "machine-not-listed", 7, "changeover.COATS"),
        ("transport = 5\n", "wrong-kind", 1, "transport"),
    ],
)
def test_tables_that_cannot_be_used(text: str, rule: str, line: int, column: str) -> None:
    if text.startswith("transport"):
        with pytest.raises(InputError) as caught:
            load_floor((text + LISTED).encode(), name="shop.toml")
        found = caught.value.faults
    else:
        found = tuple(faults(text))
    assert [(fault.rule, fault.row, fault.column) for fault in found] == [(rule, line, column)]


def test_a_way_round_that_is_shorter_is_named() -> None:
    (fault,) = faults(f"[changeover.COAT]\nbetween = 5\npairs = [{pair('red', 'black', 11)}]\n")
    assert (fault.rule, fault.text()) == (
        "way-round-shorter",
        "shop.toml row 7, column changeover.COAT: 'COAT' contradicts itself: changeover from red to black "
        "takes longer than by way of another family; give the shorter time",
    )
    ways = [pair("WASH", "CMM", 9), pair("WASH", "COAT", 2), pair("COAT", "CMM", 3)]
    (fault,) = faults(f"[transport]\nbetween = 5\npairs = [{', '.join(ways)}]\n")
    assert fault.problem == "contradicts itself: transport from WASH to CMM takes longer than by way of COAT"


def test_pairs_need_a_between_that_they_do_not_contradict() -> None:
    (fault,) = faults(f"[transport]\npairs = [{pair('WASH', 'CMM', 5)}]\n")
    assert (fault.rule, fault.text()) == (
        "between-missing",
        "shop.toml row 7, column transport.between: '' is missing, so pairs that are not listed take no "
        "time, and transport from WASH to CMM takes longer than by way of another machine; "
        "add between: the minutes of every pair that is not listed",
    )


def test_a_contradiction_is_not_looked_for_among_half_of_the_pairs() -> None:
    pairs = [pair("red", "black", 11), "{ from = 'red', to = 'grey', minutes = 'x' }"]
    assert [f.rule for f in faults(f"[changeover.COAT]\nbetween = 5\npairs = [{', '.join(pairs)}]\n")] == [
        "wrong-kind"
    ]


def test_more_names_than_can_be_checked() -> None:
    pairs = ", ".join(pair(f"a{k}", f"b{k}", 5) for k in range(MAX_NAMES // 2 + 1))
    (fault,) = faults(f"[changeover.COAT]\nbetween = 5\npairs = [{pairs}]\n")
    assert (fault.rule, fault.text()) == (
        "too-many-names",
        "shop.toml row 7, column changeover.COAT: 'COAT' has 52 names in its pairs, more than the 50 that "
        "can still be checked; give only the pairs that differ from between",
    )


def test_many_tables_share_what_can_be_checked() -> None:
    machines = "".join(f"[[machine]]\nid = 'M{k}'\n" for k in range(20))
    pairs = ", ".join(pair(f"a{k}", f"b{k}", 5) for k in range(MAX_NAMES // 2))
    tables = "".join(f"[changeover.M{k}]\nbetween = 5\npairs = [{pairs}]\n" for k in range(20))
    with pytest.raises(InputError) as caught:
        load_floor((machines + tables).encode())
    assert [fault.rule for fault in caught.value.faults] == ["too-many-names"] * 10


def test_machines_are_not_called_unknown_while_their_list_is_in_doubt() -> None:
    assert [fault.rule for fault in faults("[[machine]]\nid = 7\n[changeover.LATHE]\n")] == ["wrong-kind"]


# ---- what counts for nothing ------------------------------------------------------------------------


def test_families_that_no_row_has_are_worth_saying_with_what_may_be_meant() -> None:
    pairs = f"{pair('red', 'blck', 5)}, {pair('ivory', 'red', 5)}"
    text = f"{LISTED}[changeover.COAT]\nbetween = 9\npairs = [{pairs}]\n"
    found = reading(ORDERS, shop=text)
    assert [(notice.rule, notice.text()) for notice in found.notices] == [
        (
            "families-not-used",
            "shop.toml row 7, column changeover.COAT: 'COAT' has changeovers for 'blck' (is 'black' meant?), "
            "'ivory', which no row on it has; correct them, or leave them for other orders",
        )
    ]


def test_a_long_list_of_families_is_cut() -> None:
    pairs = ", ".join(pair(f"a{k}", "red", 5) for k in range(9))
    (text,) = notices_of(ORDERS, shop=f"{LISTED}[changeover.COAT]\nbetween = 5\npairs = [{pairs}]\n")
    assert "'a4', 'a5', 3 more, which no row on it has" in text


def test_changeovers_of_a_machine_whose_rows_have_no_family() -> None:
    found = reading(ORDERS, shop=f"{LISTED}[changeover.WASH]\nbetween = 9\n[changeover.COAT]\nbetween = 9\n")
    assert [(notice.rule, notice.text()) for notice in found.notices] == [
        (
            "changeover-idle",
            "shop.toml row 7, column changeover.WASH: 'WASH' has changeovers, but no row on it has a family; "
            "write the column family, or map it in [columns]",
        )
    ]


def test_the_family_at_the_start_may_be_yesterdays_but_is_compared_with_todays() -> None:
    coat = "[[machine]]\nid = 'COAT'\nfamily = {}\n[[machine]]\nid = 'WASH'\n[changeover.COAT]\nbetween = 9\n"
    ivory = f"pairs = [{pair('ivory', 'red', 5)}]\n"
    assert [n.rule for n in reading(ORDERS, shop=coat.format("'red'")).notices] == []
    assert "family-idle" not in [n.rule for n in reading(ORDERS, shop=coat.format("'ivory'") + ivory).notices]
    assert reading("order,machine\nA,WASH\n", shop=coat.format("'rde'")).notices == ()
    (notice,) = reading(ORDERS, shop=coat.format("'rde'")).notices
    assert (notice.rule, notice.text()) == (
        "family-idle",
        "shop.toml row 3, column machine.family: 'rde' is a family that no row on COAT has and no pair there "
        "names; the nearest is 'red'; correct it, or leave it: the first change then takes what between says",
    )


def test_without_a_list_of_machines_the_orders_tell_which_there_are() -> None:
    text = "[changeover.COATS]\nbetween = 5\n[changeover.COAT]\nbetween = 9\n"
    text += f"[transport]\npairs = [{pair('WASH', 'OVEN', 0)}]\n"
    found = reading(ORDERS, shop=text)
    assert found.shop.changeovers == {"COAT": Changeovers(540)}
    assert [(notice.rule, notice.text()) for notice in found.notices] == [
        (
            "machine-not-visited",
            "shop.toml row 1, column changeover.COATS: 'COATS' is visited by no row of the orders; the "
            "nearest is 'COAT'; nothing to do if it is meant for other orders",
        ),
        (
            "machine-not-visited",
            "shop.toml row 6, column transport.pairs[1].to: 'OVEN' is visited by no row of the orders; "
            "nothing to do if it is meant for other orders",
        ),
    ]


def test_the_column_family_counts_only_where_there_are_changeovers() -> None:
    assert [notice.rule for notice in reading(ORDERS, shop=LISTED).notices] == ["column-idle"]
    assert reading(ORDERS, shop=f"{LISTED}[changeover.COAT]\nbetween = 5\n").notices == ()
