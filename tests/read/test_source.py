"""Where input comes from, what it is called, and its hash."""

from __future__ import annotations

import hashlib
import io
import os
from pathlib import Path

import pytest

from shopfloor.errors import InputError
from shopfloor.read.orders import load
from shopfloor.read.source import take

DATA = b"order,machine\nA,M\n"


def test_a_path_bytes_and_an_open_file_hold_the_same(tmp_path: Path) -> None:
    path = tmp_path / "orders.csv"
    path.write_bytes(DATA)
    with path.open("rb") as file:
        sources = [take(path), take(str(path)), take(DATA, name="orders.csv"), take(file)]
    assert {(source.name, source.data) for source in sources} == {("orders.csv", DATA)}
    assert sources[0].sha256 == hashlib.sha256(DATA).hexdigest()


def test_names_without_a_path() -> None:
    assert take(DATA).name == "<input>"
    assert take(io.BytesIO(DATA)).name == "<input>"
    reader, writer = os.pipe()
    os.write(writer, DATA)
    os.close(writer)
    with os.fdopen(reader, "rb", buffering=0) as pipe:  # hands over what is there, not what is asked for
        assert take(pipe, name="<stdin>").data == DATA


def test_a_name_cannot_play_with_the_terminal() -> None:
    assert take(DATA, name="a\x1b[31m\nb\u202e.csv").name == "a?[31m?b?.csv"


def fault_of(path: Path | str) -> tuple[str, str]:
    with pytest.raises(InputError) as caught:
        load(path)
    (fault,) = caught.value.faults
    return fault.rule, fault.text()


def test_files_that_are_not_there_or_cannot_be_opened(tmp_path: Path) -> None:
    missing = "orders.csv: there is no such file; check the name and the folder"
    assert fault_of(tmp_path / "orders.csv") == ("file-missing", missing)
    assert fault_of("nul\0byte")[0] == "file-missing"
    rule, text = fault_of(tmp_path)
    assert rule == "file-unreadable"
    assert text == (
        f"{tmp_path.name}: cannot be read (is a directory); check that it is a file and that you may open it"
    )


def test_a_file_opened_as_text_is_a_mistake_of_the_program() -> None:
    with pytest.raises(TypeError, match="binary mode"):
        take(io.StringIO("order,machine"))  # type: ignore[arg-type]


def test_the_inputs_of_a_reading_are_named_with_their_hashes(tmp_path: Path) -> None:
    (tmp_path / "orders.csv").write_bytes(DATA)
    (tmp_path / "shop.toml").write_bytes(b"[shift]\nend = '8:00'\n")
    found = load(tmp_path / "orders.csv", shop=tmp_path / "shop.toml")
    assert found.inputs == (
        ("orders.csv", hashlib.sha256(DATA).hexdigest()),
        ("shop.toml", hashlib.sha256(b"[shift]\nend = '8:00'\n").hexdigest()),
    )
