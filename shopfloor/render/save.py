"""The only writer of output files: every file whole, and all of them or none.

Content goes to hidden temporaries in the same folder first, each flushed to the disk; only when all of
them stand are they renamed to their names. What a file replaces is kept aside until the last rename, so
that a failure half-way puts everything back.
"""

from __future__ import annotations

import contextlib
import errno
import os
import secrets
import shutil
import stat
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from shopfloor.errors import SaveError

if TYPE_CHECKING:
    from collections.abc import Mapping

Content = bytes | str

_REASONS = {
    errno.ENOSPC: "the disk is full; make room or choose another folder",
    errno.EDQUOT: "your share of the disk is used up; make room or choose another folder",
    errno.EFBIG: "the file is larger than this disk or account allows; choose another folder",
    errno.EACCES: "you may not write there; choose another folder",
    errno.EPERM: "you may not write there; choose another folder",
    errno.EROFS: "the disk is read-only; choose another folder",
    errno.ENOTDIR: "part of the path is a file, not a folder; choose another folder",
    errno.ENAMETOOLONG: "the name is too long; choose a shorter one",
    errno.EIO: "the disk reports a fault; choose another disk",
}

_EFFECTIVE = os.access in os.supports_effective_ids


def save(folder: str | os.PathLike[str], files: Mapping[str, Content]) -> list[Path]:
    """Write all `files` into `folder`, or none of them.

    Parameters
    ----------
    folder
        Created when missing, with its parents.
    files
        Plain file name to content; text is written as UTF-8, its line ends untouched.

    Returns
    -------
    list of Path
        The files, in the order given.

    Raises
    ------
    SaveError
        If a name holds a path separator, a folder, link or device stands where a file should go, or
        the disk refuses. Then no file is new or changed, no temporary is left, and folders made on
        the way are gone again.
    """
    home = Path(folder)
    targets = [home / _checked(name, home) for name in files]
    made: list[Path] = []
    try:
        _make_folder(home, made)
        _write_all(targets, list(files.values()))
    except BaseException:
        for path in reversed(made):
            with contextlib.suppress(OSError):
                path.rmdir()
        raise
    _settle(home)
    return targets


def save_file(path: str | os.PathLike[str], content: Content) -> Path:
    """Write one file whole or not at all, at the place a person named; raises as :func:`save`."""
    target = Path(path)
    return save(target.parent, {target.name: content})[0]


def refuse_unwritable(folder: str | os.PathLike[str]) -> None:
    """Say before a long search what :func:`save` would say after it, as far as can be told without writing.

    Raises
    ------
    SaveError
        If part of the path is a file, or the folder, or the one it would be made in, may not be written to.
    """
    home = Path(folder)
    with contextlib.suppress(PermissionError, FileNotFoundError):
        for path in (home, *home.parents):
            if os.path.lexists(path):
                number = 0
                if not path.is_dir():
                    number = errno.ENOTDIR
                elif not os.access(path, os.W_OK | os.X_OK, effective_ids=_EFFECTIVE):
                    number = errno.EACCES
                if number:
                    raise SaveError(_sentence(home, OSError(number, os.strerror(number))))
                return


@dataclass
class _Pending:
    """One file on its way: what is written, what stood there before, and how far it got."""

    target: Path
    part: Path
    aside: Path | None = None
    placed: bool = False

    def put_back(self) -> bool:
        """Undo this file; False when the disk did not let us, and `aside` is left as the only copy."""
        with contextlib.suppress(OSError):
            if self.placed and self.aside is None:
                self.target.unlink()
            elif self.placed and self.aside is not None:
                os.replace(self.aside, self.target)
            self.placed = False
        if self.placed and self.aside is not None:
            return False
        self.clear()
        return True

    def clear(self) -> None:
        """Remove what is only needed on the way."""
        for path in (self.part, self.aside):
            if path is not None:
                with contextlib.suppress(OSError):
                    path.unlink(missing_ok=True)


def _write_all(targets: list[Path], contents: list[Content]) -> None:
    pending: list[_Pending] = []
    current = targets[0] if targets else Path()
    try:
        for current, content in zip(targets, contents, strict=True):
            _refuse_all_but_files(current)
            pending.append(_Pending(current, _hidden_beside(current)))
            _write(pending[-1].part, content)
        for file in pending:
            current = file.target
            if os.path.lexists(current):
                file.aside = _hidden_beside(current)
                _keep(current, file.aside)
            file.placed = True  # said first: an interrupt right after the rename must undo it too
            os.replace(file.part, current)
    except BaseException as error:
        stranded = [file for file in reversed(pending) if not file.put_back()]
        if isinstance(error, OSError):
            kept = "".join(f"; what stood in {file.target.name} is in {file.aside}" for file in stranded)
            raise SaveError(_sentence(current, error) + kept) from error
        raise
    for file in pending:
        file.clear()


def _checked(name: str, home: Path) -> str:
    if name in ("", ".", "..") or any(letter in "/\\" or ord(letter) < 32 for letter in name):
        raise SaveError(f"cannot write {name!r} into {home}: it is no plain file name; leave out folders")
    return name


def _refuse_all_but_files(target: Path) -> None:
    """Refuse to replace what is no ordinary file: a rename would destroy a link or a device."""
    try:
        mode = target.lstat().st_mode
    except FileNotFoundError:
        return
    if stat.S_ISDIR(mode):
        raise SaveError(f"cannot write {target}: a folder of that name stands there; rename or remove it")
    if stat.S_ISLNK(mode):
        raise SaveError(
            f"cannot write {target}: it is a link; name the file it points to, or remove the link"
        )
    if not stat.S_ISREG(mode):
        raise SaveError(f"cannot write {target}: it is a device, not a file; name a file")


def _hidden_beside(target: Path) -> Path:
    # not derived from the name, so that a name of full length still has room
    return target.with_name(f".shopfloor-{secrets.token_hex(8)}.part")


def _write(part: Path, content: Content) -> None:
    data = content.encode("utf-8") if isinstance(content, str) else content
    # unlike tempfile, open() gives the file the rights that any other new file here gets
    with open(part, "xb") as file:
        file.write(data)
        file.flush()
        os.fsync(file.fileno())


def _keep(target: Path, aside: Path) -> None:
    """Give what stands at `target` a second name; copy it where the disk knows no hard links."""
    try:
        os.link(target, aside)
    except OSError:
        shutil.copy2(target, aside)


def _make_folder(home: Path, made: list[Path]) -> None:
    """Create `home` and its parents, noting in `made` each folder that is new, outermost first."""
    try:
        for path in (*reversed(home.parents), home):
            if not path.exists():
                path.mkdir()
                made.append(path)
        if not home.is_dir():
            raise NotADirectoryError(errno.ENOTDIR, os.strerror(errno.ENOTDIR))
    except OSError as error:
        raise SaveError(_sentence(home, error)) from error


def _settle(home: Path) -> None:
    """Flush the renames themselves, where the system lets a folder be flushed; failing is no loss."""
    with contextlib.suppress(OSError):
        handle = os.open(home, os.O_RDONLY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)


def _sentence(path: Path, error: OSError) -> str:
    reason = (
        _REASONS.get(error.errno or 0) or f"{(error.strerror or str(error)).lower()}; choose another place"
    )
    return f"cannot write {path}: {reason}"
