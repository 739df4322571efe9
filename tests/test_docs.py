"""The docs say what the code does: every command, option, bound, method and module is written down."""

from __future__ import annotations

import re
import tomllib
from pathlib import Path

from tests.cli.run import shopfloor

ROOT = Path(__file__).parents[1]
README = (ROOT / "README.md").read_text(encoding="utf-8")
DEVELOPERS = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")


def test_every_command_is_in_the_readme() -> None:
    listed = re.findall(r"^  (\w+)  ", shopfloor("--help").out, re.M)
    assert len(listed) >= 5
    for command in listed:
        assert f"`{command} " in README or f"`{command}`" in README, command


def test_every_option_has_help() -> None:
    for command in re.findall(r"^  (\w+)  ", shopfloor("--help").out, re.M):
        text = shopfloor(command, "--help").out
        for line in text.splitlines():
            if line.startswith("  --"):
                assert re.search(r"  \S.*[A-Za-z]", line[4:]) or len(line) < 40, f"{command}: {line}"


def test_every_method_is_in_the_readme() -> None:
    from shopfloor.openshop.choose import methods

    table = README.split("## What is proved, and when")[1]
    for method in methods():
        assert method.name in table, method.name


def test_links_in_the_docs_lead_somewhere() -> None:
    for text in (README, DEVELOPERS):
        for target in re.findall(r"\]\((?!http)([^)#]+)\)", text):
            assert (ROOT / target).exists(), target


def test_every_package_is_installed() -> None:
    listed = set(tomllib.loads((ROOT / "pyproject.toml").read_text())["tool"]["setuptools"]["packages"])
    found = {
        ".".join(path.parent.relative_to(ROOT).parts) for path in (ROOT / "shopfloor").rglob("__init__.py")
    }
    assert found | {"shopfloor.sample"} == listed


def test_every_page_and_sheet_says_it_is_no_permit(tmp_path: Path) -> None:
    shopfloor("plan", ROOT / "data" / "rounds" / "orders.csv", "--out", tmp_path, "--quiet")
    for page in ("gantt.html", "dispatch.html"):
        assert "not a permit" in (tmp_path / page).read_text(encoding="utf-8")
