"""Every command and option is explained in a sentence, and none of them is cut short in a list."""

from __future__ import annotations

import re
from collections.abc import Iterator
from typing import Any

import pytest
from typer.main import get_command

from shopfloor.cli.main import app
from tests.cli.run import shopfloor


def commands(command: Any, path: tuple[str, ...] = ()) -> Iterator[tuple[tuple[str, ...], Any]]:
    for name, each in getattr(command, "commands", {}).items():
        yield (*path, name), each
        yield from commands(each, (*path, name))


COMMANDS = dict(commands(get_command(app)))


@pytest.mark.parametrize("path", COMMANDS, ids=" ".join)
def test_every_argument_and_option_is_a_sentence(path: tuple[str, ...]) -> None:
    command = COMMANDS[path]
    assert command.help
    for option in command.params:
        assert re.search(r"^\S.*\.( \[default: .*\])?$", option.help or ""), (option.opts, option.help)


def test_an_option_says_the_same_wherever_it_means_the_same() -> None:
    """But for those that mean another moment, person, folder or machine, or what the journal says."""
    differ = {"--at", "--who", "--out", "--machine", "--objective", "--start", "--end"}
    said: dict[str, set[str]] = {}
    for command in COMMANDS.values():
        for option in command.params:
            if option.param_type_name == "option":
                said.setdefault(option.opts[0], set()).add(option.help)
    assert {name for name, words in said.items() if len(words) > 1} <= differ


@pytest.mark.parametrize("path", [(), ("log",)], ids=["shopfloor", "log"])
def test_no_summary_of_a_command_is_cut_short(path: tuple[str, ...]) -> None:
    listed = shopfloor(*path, "--help").out.partition("Commands:")[2]
    assert len(listed.split("\n")) > 5
    assert "..." not in listed
