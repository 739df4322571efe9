"""Each demo set shows its ability through the command line, and says by which theorem."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.cli.run import DATA, shopfloor


@pytest.mark.parametrize(
    ("name", "shop", "method", "minutes", "source"),
    [
        ("rounds", "shop.toml", "unit rounds", 450, "König 1916"),
        ("groups", "shop.toml", "unit rounds", 390, "König 1916"),
        ("crew", "shop.toml", "crew rounds", 420, "de Werra 1971"),
        ("two-machines", "shop.toml", "two machines", 405, "Gonzalez and Sahni 1976"),
        ("splits", "shop.toml", "split lots", 435, "Gonzalez and Sahni 1976"),
        ("breaks", "shop.toml", "unit rounds", 450, "König 1916"),
        ("breaks", "shop-pausing.toml", "unit rounds", 435, "taken out of the clock"),
    ],
)
def test_each_set_is_proved_by_its_theorem(name, shop, method, minutes, source, tmp_path: Path) -> None:
    folder = DATA / name
    said = shopfloor("plan", folder / "orders.csv", "--shop", folder / shop, "--json", "--out", tmp_path)
    data = said.json
    assert said.code == 0
    assert data["method"]["name"] == method
    assert source in data["method"]["why"]
    assert data["proved_optimal"] is True
    assert data["makespan_s"] == data["lower_bound_s"] == minutes * 60
    for made in ("plan.csv", "plan.json", "plan.xlsx"):
        assert shopfloor("audit", tmp_path / made, folder / "orders.csv", "--shop", folder / shop).code == 0


def test_what_fit_chooses_ends_inside_the_shift_proved(tmp_path: Path) -> None:
    folder = DATA / "overload"
    said = shopfloor(
        "fit", folder / "orders.csv", "--shop", folder / "shop.toml", "--out", tmp_path, "--json"
    )
    assert said.code == 0
    assert said.json["proved_best"] is True
    assert all(row["reason"] for row in said.json["carried"])
    planned = shopfloor("plan", tmp_path / "chosen.csv", "--shop", folder / "shop.toml", "--json")
    assert (planned.code, planned.json["fits_shift"], planned.json["proved_optimal"]) == (0, True, True)
    assert shopfloor("check", tmp_path / "carried.csv", "--shop", folder / "shop.toml").code == 0


def test_fit_without_an_end_is_told_what_to_give() -> None:
    said = shopfloor("fit", DATA / "overload" / "orders.csv")
    assert said.code == 3
    assert (
        said.err == "shopfloor: the shift has no end, so everything fits; give --end, or end in shop.toml\n"
    )


def test_even_rounds_and_a_crew_on_the_command_line() -> None:
    said = shopfloor("plan", DATA / "rounds" / "orders.csv", "--crew", 5, "--json")
    assert said.json["method"]["name"] == "crew rounds"
    assert said.json["makespan_s"] == -(-129 // 5) * 1800
    assert shopfloor("plan", DATA / "rounds" / "orders.csv", "--even", "--json").json["proved_optimal"]
