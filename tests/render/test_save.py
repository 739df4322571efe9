"""Saving is all or nothing, whatever the disk does."""

from __future__ import annotations

import errno
import os
import shutil
import sys
import tempfile
from pathlib import Path

import pytest

from shopfloor.errors import SaveError
from shopfloor.render import save as saving
from shopfloor.render.save import refuse_unwritable, save, save_file

FILES = {"plan.json": '{"schema": 1}\n', "plan.csv": "order\nTQ-1 – å\n", "plan.xlsx": b"\x00\xff"}


def contents(folder: Path) -> dict[str, bytes]:
    """Every file below `folder`, hidden ones too."""
    return {str(path.relative_to(folder)): path.read_bytes() for path in folder.rglob("*") if path.is_file()}


def test_writes_every_file_whole_and_returns_their_paths_in_order(tmp_path):
    assert save(tmp_path / "out" / "monday", FILES) == [tmp_path / "out" / "monday" / name for name in FILES]
    assert contents(tmp_path / "out" / "monday") == {
        "plan.json": b'{"schema": 1}\n',
        "plan.csv": "order\nTQ-1 – å\n".encode(),
        "plan.xlsx": b"\x00\xff",
    }


def test_replaces_its_own_files_and_leaves_others_alone(tmp_path):
    (tmp_path / "plan.csv").write_text("yesterday")
    (tmp_path / "notes.txt").write_text("mine")
    save(tmp_path, FILES)
    assert sorted(contents(tmp_path)) == ["notes.txt", "plan.csv", "plan.json", "plan.xlsx"]
    assert contents(tmp_path)["notes.txt"] == b"mine"
    assert contents(tmp_path)["plan.csv"].startswith(b"order")


def test_no_files_is_no_fault(tmp_path):
    assert save(tmp_path / "out", {}) == []


def test_single_file_goes_where_it_was_told(tmp_path):
    assert save_file(tmp_path / "chosen.csv", "order\n") == tmp_path / "chosen.csv"
    assert contents(tmp_path) == {"chosen.csv": b"order\n"}


def test_new_file_gets_ordinary_rights(tmp_path):
    before = os.umask(0o027)
    try:
        path = save_file(tmp_path / "chosen.csv", "order\n")
    finally:
        os.umask(before)
    assert path.stat().st_mode & 0o777 == 0o640


class BrokenDisk:
    """Stands in for `os` inside the module; the call numbered `at` fails with `code`."""

    def __init__(self, at: int, code: int) -> None:
        self.at, self.code, self.calls = at, code, 0

    def __getattr__(self, name: str):
        real = getattr(os, name)
        if name not in ("fsync", "replace", "link"):
            return real

        def call(*arguments):
            self.calls += 1
            if self.calls == self.at:
                raise OSError(self.code, os.strerror(self.code))
            return real(*arguments)

        return call


# with two of three files there before: three flushes, then rename, link, rename, link, rename, and the folder
@pytest.mark.parametrize("code", [errno.ENOSPC, errno.EACCES, errno.EIO])
@pytest.mark.parametrize("at", [1, 2, 3, 4, 6, 8])
def test_failure_at_any_step_leaves_everything_as_it_was(tmp_path, monkeypatch, at, code):
    (tmp_path / "plan.csv").write_text("yesterday")
    (tmp_path / "plan.xlsx").write_bytes(b"older")
    before = contents(tmp_path)
    monkeypatch.setattr(saving, "os", BrokenDisk(at, code))
    with pytest.raises(SaveError, match=f"^cannot write {tmp_path}/plan"):
        save(tmp_path, FILES)
    assert contents(tmp_path) == before


@pytest.mark.parametrize("at", [5, 7, 9, 10])
def test_a_disk_without_links_or_folder_flushes_is_written_all_the_same(tmp_path, monkeypatch, at):
    (tmp_path / "plan.csv").write_text("yesterday")
    (tmp_path / "plan.xlsx").write_bytes(b"older")
    disk = BrokenDisk(at, errno.EPERM)
    monkeypatch.setattr(saving, "os", disk)
    save(tmp_path, FILES)
    assert disk.calls == 9
    assert contents(tmp_path)["plan.xlsx"] == FILES["plan.xlsx"]
    assert sorted(contents(tmp_path)) == sorted(FILES)


@pytest.mark.parametrize("at", range(1, 7))
def test_failure_in_a_new_folder_leaves_no_folder(tmp_path, monkeypatch, at):
    monkeypatch.setattr(saving, "os", BrokenDisk(at, errno.ENOSPC))
    with pytest.raises(SaveError, match="the disk is full; make room or choose another folder"):
        save(tmp_path / "a" / "b", FILES)
    assert list(tmp_path.iterdir()) == []


def test_interrupt_leaves_nothing_either(tmp_path, monkeypatch):
    def interrupted(*_):
        raise KeyboardInterrupt

    monkeypatch.setattr(saving, "_settle", lambda home: None)
    monkeypatch.setattr(saving, "_keep", interrupted)
    (tmp_path / "plan.xlsx").write_bytes(b"older")
    with pytest.raises(KeyboardInterrupt):
        save(tmp_path, FILES)
    assert contents(tmp_path) == {"plan.xlsx": b"older"}


def test_what_cannot_be_put_back_is_kept_and_named(tmp_path, monkeypatch):
    """Two renames work, then the disk turns read-only: the old file stays beside, and is named."""
    (tmp_path / "plan.json").write_text("yesterday")
    disk = BrokenDisk(0, errno.EROFS)
    renames = []

    def replace(*arguments):
        renames.append(arguments)
        if len(renames) > 1:
            raise OSError(errno.EROFS, os.strerror(errno.EROFS))
        os.replace(*arguments)

    disk.replace = replace
    monkeypatch.setattr(saving, "os", disk)
    with pytest.raises(
        SaveError, match=r"the disk is read-only; .*; what stood in plan\.json is in "
    ) as caught:
        save(tmp_path, FILES)
    kept = Path(str(caught.value).rpartition(" is in ")[2])
    assert kept.read_text() == "yesterday"
    assert sorted(contents(tmp_path)) == sorted([kept.name, "plan.json"])


@pytest.mark.skipif(sys.platform == "win32", reason="needs a POSIX limit on file size")
def test_real_write_that_the_system_cuts_short(tmp_path):
    import resource

    (tmp_path / "plan.json").write_text("yesterday")
    soft, hard = resource.getrlimit(resource.RLIMIT_FSIZE)
    resource.setrlimit(resource.RLIMIT_FSIZE, (4096, hard))
    try:
        with pytest.raises(SaveError) as caught:
            save(tmp_path, {"plan.json": "{}", "plan.csv": "x" * 10_000})
    finally:
        resource.setrlimit(resource.RLIMIT_FSIZE, (soft, hard))
    assert str(caught.value) == (
        f"cannot write {tmp_path / 'plan.csv'}: the file is larger than this disk or account allows; "
        "choose another folder"
    )
    assert contents(tmp_path) == {"plan.json": b"yesterday"}


@pytest.fixture
def as_nobody():
    """A folder that others may enter; as root, give up root's rights, which ignore read-only folders."""
    folder = Path(tempfile.mkdtemp())
    folder.chmod(0o755)
    root = hasattr(os, "geteuid") and os.geteuid() == 0
    if root:
        os.seteuid(65534)
    try:
        yield folder
    finally:
        if root:
            os.seteuid(0)
        folder.chmod(0o755)
        shutil.rmtree(folder)


@pytest.mark.skipif(sys.platform == "win32", reason="Windows folders have no read-only mode")
def test_read_only_folder(as_nobody):
    if os.geteuid() != 65534:
        as_nobody.chmod(0o555)
    with pytest.raises(SaveError) as caught:
        save(as_nobody, FILES)
    assert str(caught.value) == (
        f"cannot write {as_nobody / 'plan.json'}: you may not write there; choose another folder"
    )
    with pytest.raises(SaveError, match="you may not write there"):
        save(as_nobody / "new", FILES)
    for folder in (as_nobody, as_nobody / "new"):
        with pytest.raises(SaveError, match="you may not write there"):
            refuse_unwritable(folder)
    assert list(as_nobody.iterdir()) == []


@pytest.mark.parametrize("name", ["", ".", "..", "../plan.csv", "a/b", "a\\b", "/etc/passwd", "a\0b", "a\nb"])
def test_refuses_names_that_are_no_plain_file_name(tmp_path, name):
    with pytest.raises(SaveError) as caught:
        save(tmp_path / "out", {"plan.json": "{}", name: "x"})
    assert str(caught.value) == (
        f"cannot write {name!r} into {tmp_path / 'out'}: it is no plain file name; leave out folders"
    )
    assert list(tmp_path.iterdir()) == []


def test_refuses_a_folder_where_a_file_should_go(tmp_path):
    (tmp_path / "plan.csv").mkdir()
    with pytest.raises(SaveError) as caught:
        save(tmp_path, FILES)
    assert str(caught.value) == (
        f"cannot write {tmp_path / 'plan.csv'}: a folder of that name stands there; rename or remove it"
    )
    assert [path.name for path in tmp_path.iterdir()] == ["plan.csv"]


def test_refuses_a_file_where_the_folder_should_be(tmp_path):
    (tmp_path / "out").write_text("mine")
    for folder in (tmp_path / "out", tmp_path / "out" / "below"):
        with pytest.raises(SaveError) as caught:
            save(folder, FILES)
        with pytest.raises(SaveError) as before:
            refuse_unwritable(folder)
        assert str(before.value) == str(caught.value)
        assert str(caught.value) == (
            f"cannot write {folder}: part of the path is a file, not a folder; choose another folder"
        )
    assert contents(tmp_path) == {"out": b"mine"}


@pytest.mark.skipif(sys.platform == "win32", reason="links and devices as POSIX knows them")
def test_refuses_links_and_devices(tmp_path):
    (tmp_path / "elsewhere").write_text("mine")
    (tmp_path / "plan.csv").symlink_to(tmp_path / "elsewhere")
    os.mkfifo(tmp_path / "pipe")
    with pytest.raises(SaveError, match="it is a link; name the file it points to, or remove the link"):
        save(tmp_path, FILES)
    with pytest.raises(SaveError, match="it is a device, not a file; name a file"):
        save_file(tmp_path / "pipe", "x")
    assert (tmp_path / "elsewhere").read_text() == "mine"
    assert not (tmp_path / "plan.json").exists()


def test_name_too_long_is_said(tmp_path):
    with pytest.raises(SaveError, match="the name is too long; choose a shorter one"):
        save_file(tmp_path / ("x" * 300), "x")
    assert list(tmp_path.iterdir()) == []
