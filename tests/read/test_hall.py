"""Breaks, machines and crews of shop.toml: what their times mean, and every way of getting them wrong."""

from __future__ import annotations

import pytest

from shopfloor.errors import InputError
from shopfloor.model.calendar import DAY, HOUR, MINUTE
from shopfloor.model.feasible import FOR_GOOD_S
from shopfloor.model.results import Fault
from shopfloor.model.shop import Closure, Crew, Machine
from shopfloor.read.floor import Floor, load_floor
from shopfloor.read.orders import load
from tests.read.reading import notices_of, reading, shop_of

SHIFT = '[shift]\nstart = "2026-03-02T06:00"\nend = "14:00"\n'
ORDERS = "order,machine,minutes\nA,M,5\n"


def floor(text: str) -> Floor:
    return load_floor(text.encode(), name="shop.toml")


def faults(text: str) -> list[Fault]:
    with pytest.raises(InputError) as caught:
        floor(text)
    return list(caught.value.faults)


def machine(keys: str) -> Machine:
    """The machine M of a morning shift, with these keys."""
    (found,) = floor(f"{SHIFT}[[machine]]\nid = 'M'\n{keys}\n").machines
    return found


def closed(keys: str) -> list[tuple[float, float, str]]:
    """When M is shut, in hours since 06:00."""
    return [(c.start_s / HOUR, c.end_s / HOUR, c.reason) for c in machine(keys).closed]


def span(start: str, end: str, reason: str = "") -> str:
    """A stretch of time as a table."""
    why = f', reason = "{reason}"' if reason else ""
    return f'{{ from = "{start}", to = "{end}"{why} }}'


# ---- breaks -----------------------------------------------------------------------------------------


def test_breaks_are_read_in_any_order_and_kept_in_order_of_time() -> None:
    text = f"{SHIFT}breaks = [ {span('12:00', '12:30')}, {span('09:00', '09:15', ' tea ')} ]\n"
    assert floor(text).breaks == (
        Closure(3 * HOUR, 3 * HOUR + 15 * MINUTE, "tea"),
        Closure(6 * HOUR, 6 * HOUR + 30 * MINUTE),
    )


@pytest.mark.parametrize(
    "entry",
    [
        '{ from = "09:00", to = "09:15" }',
        "{ from = 09:00:00, to = 09:15:00 }",
        '{ from = 2026-03-02T09:00:00, to = "2026-03-02 09:15" }',
    ],
)
def test_times_are_texts_or_toml_times(entry: str) -> None:
    assert floor(f"{SHIFT}breaks = [{entry}]\n").breaks == (Closure(3 * HOUR, 3 * HOUR + 15 * MINUTE),)


def test_breaks_may_be_tables_with_headings_of_their_own() -> None:
    text = f'{SHIFT}[[shift.breaks]]\nfrom = "09:00"\nto = "x"\n'
    (fault,) = faults(text)
    assert (fault.rule, fault.row, fault.column) == ("to-unreadable", 6, "shift.breaks[1].to")


def test_without_a_start_times_are_elapsed() -> None:
    assert floor(f"[shift]\nbreaks = [{span('3:00', '3:15')}]\n").breaks == (
        Closure(3 * HOUR, 3 * HOUR + 15 * MINUTE),
    )
    (fault,) = faults(f"[shift]\nbreaks = [{span('2026-03-02T09:00', '9:15')}]\n")
    assert fault.text() == (
        "shop.toml row 2, column shift.breaks[1].from: '2026-03-02T09:00' is a date but the shift has no "
        "start; give --start, or write elapsed time as h:mm, such as 1:30"
    )


def test_breaks_follow_a_start_given_on_the_command_line() -> None:
    text = f"{SHIFT}breaks = [{span('09:00', '09:15')}]\n"
    assert shop_of(ORDERS, shop=text, start="2026-03-02T08:00").breaks[0].start_s == HOUR
    assert shop_of(ORDERS, shop=text, start="2026-03-02T22:00").breaks[0].start_s == 11 * HOUR
    again = load(ORDERS.encode(), shop=floor(text), start="2026-03-02T08:00").shop
    assert again.breaks[0].start_s == HOUR


def test_a_time_before_the_shifts_start_is_past_midnight() -> None:
    night = '[shift]\nstart = "2026-03-02T22:00"\n'
    text = f"{night}breaks = [{span('23:50', '00:10')}, {span('02:00', '02:30')}]\n"
    assert [(pause.start_s, pause.end_s) for pause in floor(text).breaks] == [
        (110 * MINUTE, 130 * MINUTE),
        (4 * HOUR, 4 * HOUR + 30 * MINUTE),
    ]


def test_a_stretch_to_the_time_at_which_the_shift_starts_ends_a_day_later() -> None:
    assert closed(f"closed = [{span('14:00', '06:00')}]") == [(8, 24, "")]


def test_a_night_on_which_the_clocks_go_back_is_an_hour_longer() -> None:
    """The clocks of London went back on 25 October 2026 at 02:00."""
    text = '[shift]\nstart = "2026-10-24T22:00"\nzone = "Europe/London"\n'
    assert floor(f"{text}breaks = [{span('00:30', '03:00')}]\n").breaks == (
        Closure(2 * HOUR + 30 * MINUTE, 6 * HOUR),
    )


def test_breaks_that_meet_are_two_and_those_that_overlap_are_a_fault() -> None:
    meeting = f"{SHIFT}breaks = [{span('09:00', '09:15')}, {span('09:15', '09:30')}]\n"
    assert len(floor(meeting).breaks) == 2
    (fault,) = faults(meeting.replace('from = "09:15"', 'from = "09:14"'))
    assert (fault.rule, fault.text()) == (
        "breaks-overlap",
        "shop.toml row 4, column shift.breaks[2].from: '09:14' lies in the break from '09:00' to '09:15'; "
        "make one break of the two, or correct the times",
    )


def test_a_stretch_ends_after_it_starts_and_both_readings_of_the_clock_are_told() -> None:
    (fault,) = faults(f"{SHIFT}breaks = [{span('09:15', '09:15')}]\n")
    assert (fault.rule, fault.problem) == ("to-not-after-from", "is not after '09:15'")
    (fault,) = faults(f"{SHIFT}breaks = [{span('05:45', '06:15')}]\n")
    assert fault.text() == (
        "shop.toml row 4, column shift.breaks[1].to: '06:15' is not after '05:45' (a time of day before the "
        "shift's start, 06:00, is past midnight); write a later time, with its date if it is on another day"
    )
    assert closed(f"closed = [{span('2026-03-02T05:45', '06:15')}]") == [(0, 0.25, "")]


@pytest.mark.parametrize(
    ("entry", "rule", "column"),
    [
        ("{ from = '09:00' }", "key-missing", "shift.breaks[1].to"),
        ("{ to = '09:00' }", "key-missing", "shift.breaks[1].from"),
        ("{ from = 9, to = '09:15' }", "wrong-kind", "shift.breaks[1].from"),
        ("{ from = 2026-03-02, to = '09:15' }", "wrong-kind", "shift.breaks[1].from"),
        ("{ from = '09:00', to = '09:15', why = 'x' }", "unknown-key", "shift.breaks[1].why"),
        ("{ from = '09:00', to = '09:15', reason = 1 }", "wrong-kind", "shift.breaks[1].reason"),
        ("{ from = '9 am', to = '09:15' }", "from-unreadable", "shift.breaks[1].from"),
        ("{ from = '09:00', to = 2026-03-02T09:15:00Z }", "offset-not-allowed", "shift.breaks[1].to"),
        ("{ from = '09:00', to = '2062-03-02T09:15' }", "time-far-away", "shift.breaks[1].to"),
        ("'09:00'", "wrong-kind", "shift.breaks[1]"),
    ],
)
def test_breaks_that_cannot_be_used(entry: str, rule: str, column: str) -> None:
    found = [(fault.rule, fault.row, fault.column) for fault in faults(f"{SHIFT}breaks = [{entry}]\n")]
    assert found == [(rule, 4, column)]


def test_times_are_not_judged_by_a_clock_that_is_in_doubt() -> None:
    text = f'[shift]\nstart = "06:00"\nbreaks = [{span("noon", "09:15")}]\n'
    assert [fault.rule for fault in faults(text)] == ["start-unreadable"]


# ---- closures and opening hours ---------------------------------------------------------------------


def test_closures_that_overlap_become_one_with_both_reasons() -> None:
    keys = (
        f"closed = [{span('08:00', '09:00', 'cleaning')}, "
        f"{span('07:00', '08:30', 'calibration')}, {span('09:00', '10:00')}]"
    )
    assert closed(keys) == [(1, 3, "calibration, cleaning"), (3, 4, "")]


def test_what_is_over_before_the_shift_is_left_out_and_what_lies_after_it_is_kept() -> None:
    early, across = span("2026-03-02T01:00", "2026-03-02T02:00"), span("2026-03-02T05:00", "07:00")
    late = span("20:00", "21:00")
    assert closed(f"closed = [{late}, {early}, {across}]") == [(0, 1, ""), (14, 15, "")]
    assert notices_of(ORDERS, shop=f"{SHIFT}[[machine]]\nid = 'M'\nclosed = [{late}, {early}]\n") == []


def test_opening_hours_become_closures_before_between_and_for_good_after_them() -> None:
    for_good = FOR_GOOD_S / HOUR
    assert closed(f"open = [{span('10:00', '12:00')}, {span('07:00', '08:00')}]") == [
        (0, 1, "not open"),
        (2, 4, "not open"),
        (6, 6 + for_good, "not open"),
    ]
    assert closed(f"open = [{span('06:00', '08:00')}, {span('07:00', '10:00')}]") == [
        (4, 4 + for_good, "not open")
    ]


def test_a_closure_keeps_its_own_reason_beside_the_opening_hours() -> None:
    keys = f"open = [{span('07:00', '10:00')}]\nclosed = [{span('06:30', '07:30', 'oil')}, "
    keys += f"{span('08:00', '08:30')}, {span('11:00', '12:00', 'visit')}]"
    assert closed(keys) == [
        (0, 0.5, "not open"),
        (0.5, 1.5, "oil"),
        (2, 2.5, ""),
        (4, 5, "not open"),
        (5, 6, "visit"),
        (6, 4 + FOR_GOOD_S / HOUR, "not open"),
    ]


@pytest.mark.parametrize("entry", ["", span("2026-03-01T06:00", "2026-03-02T06:00")])
def test_a_machine_that_is_never_open(entry: str) -> None:
    (fault,) = faults(f"{SHIFT}[[machine]]\nid = 'M'\nopen = [{entry}]\n")
    assert (fault.rule, fault.text()) == (
        "never-open",
        "shop.toml row 6, column machine.open: 'M' is never open from the shift's start on; "
        "correct its opening hours, or leave open out",
    )


# ---- machines ---------------------------------------------------------------------------------------


def test_everything_a_machine_may_say() -> None:
    read = floor(
        f"{SHIFT}[[machine]]\nid = 'M'\nname = 'Mill'\ncount = 2\npauses = true\ncrew = 'fitters'\n"
        "heads = 0\nattended = 'set-up'\nsetup_minutes = 7.5\nfamily = 'red'\n"
        "[[crew]]\nid = 'fitters'\nheads = 3\n"
    )
    assert read.machines == (Machine("M", "Mill", 2, True, "fitters", True, (), "red"),)
    assert (read.heads, read.setup_s) == ({"M": 0}, {"M": 450})
    assert read.crews == (Crew("fitters", 3),)


@pytest.mark.parametrize(
    ("keys", "rule"),
    [
        ("pauses = 1", "wrong-kind"),
        ("pauses = 'true'", "wrong-kind"),
        ("open = '06:00'", "wrong-kind"),
        ("closed = { from = '06:00', to = '07:00' }", "wrong-kind"),
        ("crew = ['a']", "wrong-kind"),
        ("crew = 'a\\u200bb'", "control-character"),
        ("heads = '2'", "wrong-kind"),
        ("heads = true", "wrong-kind"),
        ("heads = -1", "heads-unusable"),
        ("heads = 1.5", "heads-unusable"),
        ("heads = 10001", "heads-unusable"),
        ("attended = true", "wrong-kind"),
        ("attended = 'never'", "attended-unknown"),
        ("setup_minutes = '0:10'", "wrong-kind"),
        ("setup_minutes = -1", "minutes-unusable"),
        ("setup_minutes = 0.01", "minutes-unusable"),
        ("setup_minutes = 1e999999", "minutes-unusable"),
        ("setup_minutes = 1e-999999999", "minutes-unusable"),
        ("setup_minutes = nan", "minutes-unusable"),
        ("setup_minutes = inf", "minutes-unusable"),
        ("setup_minutes = 525601", "minutes-unusable"),
        ("family = 7", "wrong-kind"),
        ("attended.x = 1", "wrong-kind"),
    ],
)
def test_keys_of_a_machine_that_cannot_be_used(keys: str, rule: str) -> None:
    text = f"{SHIFT}[[machine]]\nid = 'M'\n{keys}\n".replace("'a\\u200bb'", '"a\\u200bb"')
    assert [(fault.rule, fault.row) for fault in faults(text)] == [(rule, 6)]


@pytest.mark.parametrize("word", ["set-up", "Setup", "set up"])
def test_set_up_may_be_spelt_in_any_way(word: str) -> None:
    assert machine(f"attended = '{word}'").set_up_only


# ---- crews ------------------------------------------------------------------------------------------

CREWED = f"{SHIFT}[[machine]]\nid = 'M'\ncrew = 'fitters'\n[[crew]]\nid = 'fitters'\nheads = 4\n"


def level(start: str, end: str, heads: int) -> str:
    return f'{{ from = "{start}", to = "{end}", heads = {heads} }}'


def test_levels_are_kept_in_order_of_time() -> None:
    text = f"{CREWED}levels = [{level('12:00', '13:00', 0)}, {level('2026-03-02T05:00', '07:00', 9)}]\n"
    assert floor(text).crews == (Crew("fitters", 4, ((0, HOUR, 9), (6 * HOUR, 7 * HOUR, 0))),)


@pytest.mark.parametrize(
    ("entry", "rule"),
    [
        ("{ from = '12:00', to = '13:00' }", "key-missing"),
        ("{ from = '12:00', to = '13:00', heads = -1 }", "heads-unusable"),
        ("{ from = '12:00', to = '13:00', heads = 1, reason = 'x' }", "unknown-key"),
        ("{ from = '13:00', to = '12:00', heads = 1 }", "to-not-after-from"),
        (f"{level('08:00', '10:00', 1)}, {level('09:00', '11:00', 2)}", "levels-overlap"),
    ],
)
def test_levels_that_cannot_be_used(entry: str, rule: str) -> None:
    assert [(f.rule, f.row) for f in faults(f"{CREWED}levels = [{entry}]\n")] == [(rule, 10)]


def test_a_level_outside_the_shift_is_worth_saying() -> None:
    late, early = level("14:00", "15:00", 2), level("2026-03-02T04:00", "2026-03-02T06:00", 2)
    text = f"{CREWED}levels = [{late}, {early}]\n"
    shop = shop_of(ORDERS, shop=text)
    assert shop.crews[0].levels == ((8 * HOUR, 9 * HOUR, 2),)
    assert [notice.rule for notice in reading(ORDERS, shop=text).notices] == ["level-outside"] * 2
    assert notices_of(ORDERS, shop=text)[0] == (
        "shop.toml row 10, column crew.levels[2].from: '2026-03-02T04:00' begins a level of crew fitters "
        "that lies outside the shift; check the times and the date"
    )


def test_crews_have_an_id_and_heads_and_are_listed_once() -> None:
    entries = ("heads = 1", "id = 'a'", "id = 'b'\nheads = 0", "id = 'b'\nheads = 1")
    text = "".join(f"[[crew]]\n{entry}\n" for entry in entries)
    assert [(fault.rule, fault.row, fault.column) for fault in faults(text)] == [
        ("key-missing", 1, "crew.id"),
        ("key-missing", 3, "crew.heads"),
        ("crew-duplicate", 9, "crew.id"),
    ]


def test_a_crew_that_is_not_listed_is_named_with_the_nearest() -> None:
    (fault,) = faults(CREWED.replace("crew = 'fitters'", "crew = 'fiters'"))
    assert (fault.rule, fault.text()) == (
        "crew-unknown",
        "shop.toml row 6, column machine.crew: 'fiters' is no crew of this file; the nearest is 'fitters'; "
        "correct it, or add a [[crew]] with this id",
    )
    (fault,) = faults(f"{SHIFT}[[machine]]\nid = 'M'\ncrew = 'fitters'\n")
    assert (fault.rule, fault.problem) == ("crew-unknown", "is no crew of this file")
    hidden = CREWED.replace("id = 'fitters'", "id = 7")
    assert [fault.rule for fault in faults(hidden)] == ["wrong-kind"]


# ---- what counts for nothing ------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("keys", "rule", "text"),
    [
        (
            "heads = 2",
            "machine-without-crew",
            "shop.toml row 6, column machine.heads: 'M' has heads but no crew; "
            "add its crew; heads counts only for a crew given with --crew",
        ),
        (
            "attended = 'set-up'",
            "machine-without-crew",
            "shop.toml row 6, column machine.attended: 'M' has attended but no crew; "
            "add its crew; attended counts only for a crew given with --crew",
        ),
        (
            "[[crew]]\nid = 'fitters'\nheads = 4",
            "crew-idle",
            "shop.toml row 7, column crew.id: 'fitters' is the crew of no machine; "
            'name it where it works: crew = "fitters"',
        ),
        (
            "attended = 'set-up'\ncrew = 'fitters'\n[[crew]]\nid = 'fitters'\nheads = 4",
            "set-up-only-idle",
            "shop.toml row 6, column machine.attended: 'M' is attended at set-up only, but no row on it has "
            "a set-up: it takes nobody; write setup_minutes, here or in the orders, or delete attended",
        ),
        (
            "family = 'red'",
            "family-without-changeover",
            "shop.toml row 6, column machine.family: 'red' counts for nothing while shop.toml has no "
            "[changeover] for M; add it, or delete the family",
        ),
    ],
)
def test_what_has_no_effect_is_worth_saying(keys: str, rule: str, text: str) -> None:
    found = reading(ORDERS, shop=f"{SHIFT}[[machine]]\nid = 'M'\n{keys}\n")
    assert [(notice.rule, notice.text()) for notice in found.notices] == [(rule, text)]


def test_a_machine_that_these_orders_do_not_visit_is_not_mentioned() -> None:
    text = f"{CREWED}[[machine]]\nid = 'N'\nattended = 'set-up'\ncrew = 'fitters'\n"
    assert notices_of(ORDERS, shop=text) == []


def test_a_far_closure_is_kept_whole() -> None:
    assert closed(f"closed = [{span('2026-03-09T06:00', '2026-03-10T06:00')}]") == [(7 * 24, 8 * 24, "")]
    assert machine(f"closed = [{span('2026-03-09T06:00', '2026-03-10T06:00')}]").closed[0].start_s == 7 * DAY
