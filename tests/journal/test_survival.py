"""Killed recorders, many at once, full disks and read-only folders: nothing acknowledged is lost."""

from __future__ import annotations

import contextlib
import csv
import os
import random
import re
import signal
import sqlite3
import subprocess
import tempfile
import time
import traceback
from collections import Counter
from collections.abc import Callable, Iterator
from itertools import count
from pathlib import Path

import pytest
from typer.main import get_command

from shopfloor.cli import log
from shopfloor.journal.entries import Entry
from shopfloor.journal.errors import JournalError
from shopfloor.journal.events import Journal
from shopfloor.model.actuals import Kind
from tests.journal.floor import LATE, filed, machine, put, work

LOG = get_command(log.app)
KILLS = 240
BATCH = 4


def in_child(task: Callable[[], None]) -> int:
    """Run `task` in a process of its own and return its number; the child never comes back here."""
    child = os.fork()
    if child:
        return child
    try:
        task()
    except BaseException:
        traceback.print_exc()
        os._exit(1)
    os._exit(0)


def command(*arguments: str) -> None:
    """Run one ``log`` command as the command line would."""
    assert LOG.main([*arguments, "--quiet"], "log", standalone_mode=False) in (None, 0)


def keep_recording(path: Path, scratch: Path, tag: str, acknowledge: int) -> None:
    """Record remarks, singly and by import, until killed; say each id once it is recorded."""
    for number in count():
        name = f"{tag}-{number}"
        if number % 3 == 2:
            with scratch.open("w", newline="") as file:
                rows = csv.writer(file)
                rows.writerow(["event", "at", "text", "id"])
                rows.writerows(["remark", "06:05", "word", f"{name}-{row}"] for row in range(BATCH))
            command("import", str(scratch), "--journal", str(path))
            names = [f"{name}-{row}" for row in range(BATCH)]
        else:
            command("remark", "word", "--at", "06:05", "--id", name, "--journal", str(path))
            names = [name]
        os.write(acknowledge, "".join(f"{one}\n" for one in names).encode())


def recorded(path: Path) -> set[str]:
    """Return the ids in a journal that must be sound."""
    with Journal.open(path, write=False) as book:
        book.check()
        events = book.events()
    assert len({event.id for event in events}) == len(events)
    return {event.id for event in events}


@pytest.fixture
def memory_disk(tmp_path: Path) -> Iterator[Path]:
    """A folder on a disk in memory, where there is one: thousands of commits wait for no platter."""
    shared = Path("/dev/shm")
    if not os.access(shared, os.W_OK):
        yield tmp_path
        return
    with tempfile.TemporaryDirectory(dir=shared) as name:
        yield Path(name)


def killed_at_random(task: Callable[[int], None], chance: random.Random) -> str:
    """Run `task` in a child, kill it a while after its first few acknowledgements; return all of them."""
    reader, writer = os.pipe()
    child = in_child(lambda: task(writer))
    os.close(writer)
    enough, said = chance.randrange(4), b""
    while said.count(b"\n") < enough:
        more = os.read(reader, 4096)
        assert more, "the recorder ended by itself"
        said += more
    time.sleep(chance.random() * 0.03)
    os.kill(child, signal.SIGKILL)
    os.waitpid(child, 0)
    while more := os.read(reader, 4096):
        said += more
    os.close(reader)
    return said.decode()


def test_no_acknowledged_entry_is_lost_and_no_import_is_halved_by_killing_the_recorder(
    memory_disk: Path,
) -> None:
    path = memory_disk / "shift.db"
    filed(path).close()
    command("remark", "warm", "--at", "06:01", "--journal", str(path))  # imports are paid for once, here
    chance = random.Random(240)
    acknowledged: set[str] = set()
    for kill in range(KILLS):
        scratch, tag = memory_disk / f"{kill}.csv", f"k{kill}"
        said = killed_at_random(
            lambda pipe, scratch=scratch, tag=tag: keep_recording(path, scratch, tag, pipe),
            chance,
        )
        acknowledged |= set(said.split())
        if kill % 40 == 39:
            assert recorded(path) >= acknowledged
    found = recorded(path)
    assert found >= acknowledged
    assert len(acknowledged) > KILLS
    batches = Counter(name.rpartition("-")[0] for name in found if re.fullmatch(r"k\d+-\d+-\d+", name))
    assert batches
    assert set(batches.values()) == {BATCH}


def test_a_journal_killed_in_the_making_is_there_whole_or_not_at_all(memory_disk: Path) -> None:
    rows = [(f"TQ-{k}", f"M{k % 12}", 1, k, k + 1) for k in range(300)]
    began = time.perf_counter()
    filed(memory_disk / "undisturbed.db", rows=rows).close()
    took = time.perf_counter() - began
    for kill in range(30):
        path = memory_disk / f"{kill}.db"
        child = in_child(lambda path=path: filed(path, rows=rows).close())
        time.sleep(took * kill / 20)
        os.kill(child, signal.SIGKILL)
        os.waitpid(child, 0)
        if path.exists():
            assert len(recorded(path)) == 1


def test_eight_recorders_at_once_lose_nothing_and_write_nothing_twice(memory_disk: Path) -> None:
    path = memory_disk / "shift.db"
    filed(path, rows=[(f"TQ-{k}", f"M{k}", 1, 0, 30) for k in range(8)]).close()

    def task(worker: int) -> None:
        with Journal.open(path) as book:
            for number in range(1_000):
                kind = Kind.UP if number % 2 else Kind.DOWN
                reason = {} if number % 2 else {"reason": "seal"}
                entry = Entry(kind, number, machine=f"M{worker}", id=f"{worker}-{number}", data=reason)
                book.record([entry], LATE)

    children = [in_child(lambda worker=worker: task(worker)) for worker in range(8)]
    codes = [os.waitpid(child, 0)[1] for child in children]
    assert codes == [0] * 8
    assert recorded(path) >= {f"{worker}-{number}" for worker in range(8) for number in range(1_000)}
    with Journal.open(path, write=False) as book:
        events = book.events()
        assert len(events) == 8_001
        assert not book.state().odd
        assert [event.seq for event in events] == list(range(1, 8_002))


def test_a_journal_is_made_once_when_several_make_it_at_once(tmp_path: Path) -> None:
    path = tmp_path / "shift.db"

    def task() -> None:
        with contextlib.suppress(JournalError):
            filed(path).close()

    children = [in_child(task) for _ in range(6)]
    assert [os.waitpid(child, 0)[1] for child in children] == [0] * 6
    assert len(recorded(path)) == 1
    assert [one.name for one in tmp_path.iterdir()] == ["shift.db"]


def test_a_recorder_gives_up_politely_when_another_keeps_the_file(tmp_path: Path) -> None:
    path = tmp_path / "shift.db"
    with filed(path):
        other = sqlite3.connect(path, isolation_level=None)
        other.execute("BEGIN IMMEDIATE")
        with Journal.open(path, busy_s=0.05) as book, pytest.raises(JournalError) as caught:
            put(book, machine("down", "CMM", 1, reason="x"))
        other.close()
    assert str(caught.value) == (
        f"cannot write {path}: another program has kept it in use for 30 s; try again"
    )


# ---- disks that refuse -------------------------------------------------------------------------------


def fill(book: Journal) -> int:
    """Record remarks until the disk is full; return how many were acknowledged."""
    full = re.escape(f"cannot write {book.path}: the disk is full; make room, then record this again")
    acknowledged: list[int] = []
    with pytest.raises(JournalError, match=f"^{full}$"):
        record_without_end(book, acknowledged)
    return len(acknowledged)


def record_without_end(book: Journal, acknowledged: list[int]) -> None:
    for number in count():
        book.record([Entry(Kind.REMARK, number, data={"text": "word " * 150})], LATE)
        acknowledged.append(number)


def test_a_full_disk_is_told_and_the_journal_stands(tmp_path: Path) -> None:
    path = tmp_path / "shift.db"
    with filed(path) as book:
        book._connection.execute("PRAGMA max_page_count = 60")
        done = fill(book)
        assert done > 10
        assert len(book.events()) == 1 + done
    assert len(recorded(path)) == 1 + done
    with Journal.open(path) as book:  # with room again, on it goes
        put(book, work("started", "TQ-1", "WASH", 5))


@pytest.fixture
def small_disk(tmp_path: Path) -> Iterator[Path]:
    """A disk of 600 KiB where we may mount one; else a folder, its journals kept small by SQLite."""
    folder = tmp_path / "disk"
    folder.mkdir()
    mounted = (
        subprocess.run(
            ["mount", "-t", "tmpfs", "-o", "size=600k", "tmpfs", str(folder)],
            capture_output=True,
            check=False,
        ).returncode
        == 0
        if os.geteuid() == 0
        else False
    )
    yield folder
    if mounted:
        subprocess.run(["umount", str(folder)], check=True)


def test_a_disk_that_really_is_full_loses_no_entry(small_disk: Path) -> None:
    path = small_disk / "shift.db"
    with filed(path) as book:
        if not os.path.ismount(small_disk):
            book._connection.execute("PRAGMA max_page_count = 80")
        done = fill(book)
        assert done > 10
        assert len(book.events()) == 1 + done
    assert len(recorded(path)) == 1 + done


def test_no_journal_is_left_behind_where_there_is_no_room_for_one(small_disk: Path) -> None:
    if not os.path.ismount(small_disk):
        small_disk.rmdir()  # the other way for a disk to have no room for a file
    else:
        (small_disk / "ballast").write_bytes(bytes(590_000))
    with pytest.raises(JournalError, match="cannot write"):
        filed(small_disk / "shift.db")
    if small_disk.exists():
        assert [one.name for one in small_disk.iterdir()] == ["ballast"]


@contextlib.contextmanager
def as_nobody() -> Iterator[None]:
    """Act as a user without rights; the superuser may write anywhere."""
    if os.geteuid() != 0:
        yield
        return
    os.seteuid(65534)
    try:
        yield
    finally:
        os.seteuid(0)


@pytest.fixture
def locked(tmp_path: Path) -> Iterator[Path]:
    """A journal in a folder that others may read and not write."""
    for folder in (tmp_path, *tmp_path.parents[:2]):
        folder.chmod(0o755)
    home = tmp_path / "home"
    home.mkdir()
    path = home / "shift.db"
    with filed(path) as book:
        put(book, work("started", "TQ-1", "WASH", 5))
    path.chmod(0o444)
    home.chmod(0o555)
    yield path
    home.chmod(0o755)


def test_a_journal_in_a_read_only_folder_is_read_and_not_written(locked: Path) -> None:
    before = locked.read_bytes()
    with as_nobody():
        with Journal.open(locked, write=False) as book:
            book.check()
            assert len(book.events()) == 2
        with pytest.raises(JournalError) as caught, Journal.open(locked) as book:
            put(book, work("finished", "TQ-1", "WASH", 30))
        with pytest.raises(JournalError, match="cannot write"):
            filed(locked.with_name("other.db"))
    assert str(caught.value) == (
        f"cannot write {locked}: you may not write into its folder; ask for the right to, or copy the file "
        "elsewhere"
    )
    assert locked.read_bytes() == before
    assert [one.name for one in locked.parent.iterdir()] == ["shift.db"]


def test_the_command_line_may_show_it_and_not_write_it(locked: Path) -> None:
    command("show", "--journal", str(locked))  # what it imports, it imports while it may
    with as_nobody():
        command("show", "--journal", str(locked))
        with pytest.raises(JournalError, match="you may not write into its folder"):
            command("remark", "x", "--at", "06:05", "--journal", str(locked))
