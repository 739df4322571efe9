"""Every demo set is sound, says nothing that needs a notice, and shows what its README says of it."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest

from shopfloor.model.calendar import HOUR, MINUTE
from shopfloor.model.shop import Shop
from shopfloor.read.orders import load

DATA = Path(__file__).parents[2] / "data"
README = (DATA / "README.md").read_text(encoding="utf-8")
SETS = sorted(path.parent.name for path in DATA.glob("*/orders.csv"))
FLOORS = [(path.parent.name, path.name) for path in sorted(DATA.glob("*/shop*.toml"))]
SOUND = [(folder, floor) for folder, floor in FLOORS if folder != "faulty"]


def shop(folder: str, floor: str = "shop.toml") -> Shop:
    return load(DATA / folder / "orders.csv", shop=DATA / folder / floor).shop


def degrees(hall: Shop) -> dict[str, int]:
    counts = np.bincount(hall.operations.machine, minlength=len(hall.machines))
    return dict(zip((machine.id for machine in hall.machines), counts.tolist(), strict=True))


@pytest.mark.parametrize(("folder", "floor"), SOUND)
def test_every_set_is_read_without_a_fault_or_a_notice(folder: str, floor: str) -> None:
    found = load(DATA / folder / "orders.csv", shop=DATA / folder / floor)
    assert [notice.text() for notice in found.notices] == []
    assert found.shop.shift_end_s == 8 * HOUR
    assert all(order.startswith("TQ-") for order in found.shop.orders.ids)


def test_every_set_is_in_the_readme_with_a_command_that_names_files_that_are_there() -> None:
    assert re.findall(r"^\| `([\w-]+)` \|", README, re.M) == [
        *("rounds", "groups", "crew", "breaks", "splits", "two-machines", "mixed", "overload", "faulty"),
        "benchmarks",
    ]
    assert set(SETS) <= set(re.findall(r"^\| `([\w-]+)` \|", README, re.M))
    commands = re.findall(r"`(shopfloor (?:check|plan) data/[^`]*)`", README)
    assert len(commands) == len(SETS)
    for command in commands:
        for word in command.split():
            assert not word.startswith("data/") or (DATA.parent / word).is_file(), command


def test_no_order_number_stands_in_two_sets() -> None:
    seen: dict[str, str] = {}
    for folder in SETS:
        if folder == "faulty":
            continue
        for order in shop(folder).orders.ids:
            assert seen.setdefault(order, folder) == folder


def test_mixed_has_everything_that_a_hall_can_have() -> None:
    hall = shop("mixed")
    assert hall.orders.ids == tuple(f"TQ-{number}" for number in range(101, 141))
    assert len(hall.machines) == 10
    assert [pause.reason for pause in hall.breaks] == ["tea", "lunch"]
    assert {machine.pauses for machine in hall.machines} == {True, False}
    assert [(m.id, m.count) for m in hall.machines if m.count > 1] == [("CMM", 2)]
    assert [(m.id, c.reason) for m in hall.machines for c in m.closed] == [
        ("PRESS-TEST", "gauge calibration")
    ]
    assert [crew.levels for crew in hall.crews] == [((5 * HOUR + 1800, 7 * HOUR, 4),)]
    assert [m.id for m in hall.machines if m.set_up_only] == ["BALANCE"]
    assert set(hall.changeovers) == {"COAT"}
    assert hall.families == ("grey", "black", "red")
    assert hall.transport.seconds("WASH", "CMM") == 5 * MINUTE
    assert hall.has_steps
    assert hall.has_due
    assert hall.operations.setup_s.any()


def test_mixed_asks_of_every_machine_no_more_than_a_shift_can_give() -> None:
    hall = shop("mixed")
    for machine, clock, load_s in zip(hall.machines, hall.machine_clocks, hall.machine_load_s, strict=True):
        share = int(load_s) / (machine.count * int(clock.worked(hall.shift_end_s)))
        assert 0.3 < share <= 0.85, machine.id


def test_the_small_sets_are_bound_by_what_they_show() -> None:
    groups, crew, breaks = shop("groups"), shop("crew"), shop("breaks")
    assert all(hall.unit_rounds for hall in (groups, crew, breaks))
    assert [machine.count for machine in groups.machines if machine.count > 1] == [2, 3]
    assert (
        max(-(-degrees(groups)[m.id] // m.count) for m in groups.machines)
        == 13
        == degrees(groups)["WASH"] / 2
    )
    assert (len(crew), crew.crews[0].heads, max(degrees(crew).values())) == (83, 6, 12)
    assert max(degrees(breaks).values()) == 13
    assert len(breaks.breaks) == 2
    assert not any(machine.pauses for machine in breaks.machines)
    pausing = shop("breaks", "shop-pausing.toml")
    assert all(machine.pauses for machine in pausing.machines)
    assert pausing.breaks == breaks.breaks


def test_splits_have_one_giant_order_and_two_machines_have_two() -> None:
    splits, two = shop("splits"), shop("two-machines")
    assert splits.operations.splittable.all()
    assert splits.orders.ids[int(splits.job_load_s.argmax())] == "TQ-401"
    assert int(splits.job_load_s.max()) == 7 * HOUR + 15 * MINUTE > int(splits.machine_load_s.max())
    assert [machine.id for machine in two.machines] == ["WASH", "COAT"]
    assert int(two.machine_load_s.max()) == 6 * HOUR + 45 * MINUTE
    assert len(np.unique(two.operations.seconds)) == 5
