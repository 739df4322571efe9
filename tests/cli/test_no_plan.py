"""`plan` says which rules clash when there is no plan, and ends with 3."""

from __future__ import annotations

from pathlib import Path

from tests.cli.run import shopfloor

ORDERS = """\
order,machine,minutes,release
TQ-001,SAW,240,
TQ-002,SAW,200,07:00
TQ-003,SAW,30,
TQ-003,CMM,60,
"""
SHOP = """\
[shift]
start = "2026-03-02T06:00"
end = "14:00"
[[machine]]
id = "SAW"
open = [{ from = "06:00", to = "13:45" }]
[[machine]]
id = "CMM"
"""


def test_rules_that_clash_are_named_with_their_rows(tmp_path: Path) -> None:
    (tmp_path / "orders.csv").write_text(ORDERS, encoding="utf-8")
    (tmp_path / "shop.toml").write_text(SHOP, encoding="utf-8")
    run = shopfloor("plan", tmp_path / "orders.csv", "--shop", tmp_path / "shop.toml", "--time-limit", "1")
    assert run.code == 3
    assert run.out == ""
    assert run.err.endswith(
        "shopfloor: no plan can keep all of this together:\n"
        "  - SAW is shut for good from 13:45 (not open)\n"
        "  - TQ-001 takes 4 h on SAW (row 2)\n"
        "  - TQ-002 takes 3 h 20 on SAW (row 3)\n"
        "  - TQ-003 takes 30 min on SAW (row 4)\n"
        "  - SAW serves one order at a time\n"
        "With any one of them eased far enough there is a plan.\n"
    )
