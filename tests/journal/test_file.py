"""What is no journal of ours is refused in clear words, and tables are brought up to date step by step."""

from __future__ import annotations

import sqlite3
from pathlib import Path

import pytest

from shopfloor.journal import file, migrations
from shopfloor.journal.errors import JournalError
from shopfloor.journal.events import Journal
from tests.journal.floor import filed, put, work


def opened(path: Path, *, write: bool = True) -> str:
    """Return what is said about a file that is no journal, having checked that it was left alone."""
    before = path.read_bytes() if path.is_file() else None
    with pytest.raises(JournalError) as caught, Journal.open(path, write=write) as book:
        book.check()
    if before is not None:
        assert path.read_bytes() == before
    return str(caught.value)


@pytest.fixture
def path(tmp_path: Path) -> Path:
    path = tmp_path / "shift.db"
    with filed(path) as book:
        put(book, *(work("started", "TQ-1", "WASH", 5), work("finished", "TQ-1", "WASH", 30)))
    return path


def test_a_missing_file_is_not_made(tmp_path: Path) -> None:
    path = tmp_path / "shift.db"
    assert opened(path) == (
        f"cannot open {path}: there is no such journal; make one with: shopfloor log open PLAN"
    )
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize("content", [b"", b"order,machine\nTQ-1,WASH\n", b"SQLite format 2\0" + bytes(2000)])
def test_a_file_of_another_kind_is_no_journal(content: bytes, tmp_path: Path) -> None:
    path = tmp_path / "orders.csv"
    path.write_bytes(content)
    assert opened(path) == f"cannot open {path}: it is no journal; name the file that `log open` made"


def test_a_database_of_another_program_is_no_journal(tmp_path: Path) -> None:
    path = tmp_path / "other.db"
    other = sqlite3.connect(path)
    other.execute("CREATE TABLE event (seq INTEGER)")
    other.commit()
    other.close()
    assert opened(path) == f"cannot open {path}: it is no journal; name the file that `log open` made"


def test_a_folder_is_no_journal(tmp_path: Path) -> None:
    assert opened(tmp_path) == f"cannot open {tmp_path}: it is a folder; name a file in it"


def test_a_journal_of_a_newer_release_is_left_alone(path: Path) -> None:
    newer = sqlite3.connect(path)
    newer.execute("PRAGMA user_version = 99")
    newer.close()
    newest = len(migrations.MIGRATIONS)
    assert opened(path) == (
        f"cannot open {path}: it is of version 99, and this release knows none above {newest}; use the newer "
        "release that made it"
    )


@pytest.mark.parametrize("write", [True, False])
def test_a_damaged_journal_is_told_when_it_is_checked(path: Path, write: bool) -> None:
    data = bytearray(path.read_bytes())
    for page in range(2, len(data) // 4096):  # the first page stays, so that it still looks like ours
        data[page * 4096 : page * 4096 + 2048] = bytes(range(256)) * 8
    path.write_bytes(data)
    assert "damaged" in opened(path, write=write)


def test_a_journal_cut_short_is_told(path: Path) -> None:
    path.write_bytes(path.read_bytes()[: 3 * 4096])
    assert "damaged" in opened(path)


def test_a_sound_journal_passes_its_check_and_reading_leaves_nothing_behind(path: Path) -> None:
    with Journal.open(path, write=False) as book:
        book.check()
        assert len(book.events()) == 3
    assert [one.name for one in path.parent.iterdir()] == ["shift.db"]


def test_a_reader_writes_nothing(path: Path) -> None:
    with (
        Journal.open(path, write=False) as book,
        pytest.raises(JournalError, match="you may not write there"),
    ):
        put(book, work("started", "TQ-2", "CMM", 5))


def test_a_second_journal_does_not_replace_the_first(path: Path) -> None:
    before = path.read_bytes()
    with pytest.raises(JournalError) as caught:
        filed(path)
    assert str(caught.value) == f"cannot write {path}: a file of that name stands there; choose another name"
    assert path.read_bytes() == before
    assert [one.name for one in path.parent.iterdir()] == ["shift.db"]


def test_a_journal_in_a_folder_that_is_not_there_is_told(tmp_path: Path) -> None:
    path = tmp_path / "none" / "shift.db"
    with pytest.raises(JournalError) as caught:
        filed(path)
    assert str(caught.value) == (
        f"cannot write {path}: there is no folder {path.parent}; make it, or choose another"
    )
    assert list(tmp_path.iterdir()) == []


def test_whether_entries_can_be_written_is_known_before_there_are_any(path: Path) -> None:
    before = path.read_bytes()
    with Journal.open(path) as book:
        book.ready()
    assert path.read_bytes() == before
    with (
        Journal.open(path, write=False) as book,
        pytest.raises(JournalError, match="you may not write there"),
    ):
        book.ready()


# ---- versions ----------------------------------------------------------------------------------------


def test_tables_are_brought_up_to_date_from_every_version() -> None:
    further = (*migrations.MIGRATIONS, "CREATE TABLE later (x);\n", "ALTER TABLE later ADD COLUMN y;\n")
    for first in range(len(further) + 1):
        connection = sqlite3.connect(":memory:", isolation_level=None)
        assert migrations.migrate(connection, further[:first]) == first
        assert migrations.migrate(connection, further) == len(further) - first
        assert migrations.version(connection) == len(further)
        assert migrations.migrate(connection, further) == 0
        connection.execute("SELECT x, y FROM later")


def test_a_step_that_fails_changes_nothing() -> None:
    connection = sqlite3.connect(":memory:", isolation_level=None)
    migrations.migrate(connection)
    bad = (*migrations.MIGRATIONS, "CREATE TABLE later (x);\nCREATE TABLE later (x);\n")
    with pytest.raises(sqlite3.OperationalError):
        migrations.migrate(connection, bad)
    assert migrations.version(connection) == len(migrations.MIGRATIONS)
    assert connection.execute("SELECT count(*) FROM sqlite_master WHERE name = 'later'").fetchone() == (0,)


def test_an_older_journal_is_read_once_it_was_brought_up_to_date(
    path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    further = (*migrations.MIGRATIONS, "CREATE TABLE later (x);\n")
    monkeypatch.setattr(migrations, "MIGRATIONS", further)
    monkeypatch.setattr(migrations.migrate, "__defaults__", (further,))
    assert opened(path, write=False) == (
        f"cannot read {path}: it is of version {len(further) - 1}, older than {len(further)}; record "
        "something in it, such as a remark, which brings it up to date"
    )
    with Journal.open(path) as book:
        put(book, work("started", "TQ-2", "CMM", 5))
    with Journal.open(path, write=False) as book:
        assert len(book.events()) == 4


def test_what_sqlite_says_beyond_these_keeps_its_traceback(tmp_path: Path) -> None:
    connection = sqlite3.connect(":memory:")
    with pytest.raises(sqlite3.OperationalError, match="no such table"), file.in_words(tmp_path, "read"):
        connection.execute("SELECT * FROM nowhere")
