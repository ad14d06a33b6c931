"""The hidden place beside a report in which it is written, locked while its run lives; and what killed runs left.

Beside a report `room` two names may stand for a while: `.reconcile-1f2e3d4c`, a folder, and `.reconcile-1f2e3d4c.lock`,
which its run holds locked. The system lets go of the lock however the run ends, so that a lock that can be had means
that nobody works there any more.
"""

from __future__ import annotations

import contextlib
import errno
import json
import os
import re
import secrets
import shutil
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

PREFIX = ".reconcile-"
_HELD = frozenset({errno.EAGAIN, errno.EWOULDBLOCK, errno.EACCES, errno.EDEADLK})
_LOCK = re.compile(r"\.reconcile-[0-9a-f]{8}\.lock")
NEW, OLD, JOURNAL = "new", "old", "swap.json"
"""In the place: the report being written; the one being replaced, and the journal, where two renames are needed."""


def _try_lock(handle: int) -> bool | None:
    """Lock an open file; False where another run holds it, None where the file system has no locks."""
    try:
        if sys.platform == "win32":
            import msvcrt

            msvcrt.locking(handle, msvcrt.LK_NBLCK, 1)
        else:
            import fcntl

            fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except OSError as error:
        return False if error.errno in _HELD else None
    return True


def _still_there(handle: int, path: Path) -> bool:
    """Whether the open file is the one of that name; another run may have removed it before it was locked."""
    try:
        return os.path.samestat(os.fstat(handle), os.stat(path))
    except OSError:
        return False


def _remove(place: Path, lock: Path, handle: int) -> None:
    """Remove a place, its lock last: what cannot be removed stays marked for the next run."""
    shutil.rmtree(place, ignore_errors=True)
    if sys.platform == "win32":  # an open file cannot be removed there
        os.close(handle)
    if not os.path.lexists(place):
        with contextlib.suppress(OSError):
            lock.unlink()
    if sys.platform != "win32":
        os.close(handle)


@contextmanager
def working_place(parent: Path) -> Iterator[Path]:
    """A new empty folder in `parent`, locked, and removed with all that is still in it at the end."""
    while True:
        lock = parent / f"{PREFIX}{secrets.token_hex(4)}.lock"
        handle = os.open(lock, os.O_CREAT | os.O_EXCL | os.O_RDWR, 0o666)
        locked = _try_lock(handle)
        if locked is None or (locked and _still_there(handle, lock)):
            break
        os.close(handle)  # taken for leavings in the moment before it was locked
    place = lock.with_suffix("")
    try:
        place.mkdir()
        yield place
    finally:
        _finish_swap(place)  # an interruption may come anywhere
        _remove(place, lock, handle)


def begin_swap(place: Path, folder: Path) -> None:
    """Write into the journal whose place the new report will take, durably, before the first of two renames."""
    with (place / JOURNAL).open("x", encoding="utf-8") as file:
        json.dump({"report": folder.name}, file)
        file.flush()
        os.fsync(file.fileno())


def settle(parent: Path) -> None:
    """Complete or undo a swap that was killed halfway, and remove what killed runs left; live runs are let be.

    What this run may not change is left as it is, for one that may.
    """
    try:
        locks = sorted(entry.name for entry in os.scandir(parent) if _LOCK.fullmatch(entry.name))
    except OSError:
        return
    for name in locks:
        with contextlib.suppress(OSError):
            _settle(parent / name)


def _settle(lock: Path) -> None:
    handle = os.open(lock, os.O_RDWR)
    if not (_try_lock(handle) and _still_there(handle, lock)):
        os.close(handle)
        return
    place = lock.with_suffix("")
    try:
        _finish_swap(place)
    except OSError:
        os.close(handle)  # nothing is removed while the old report may be in there
        raise
    _remove(place, lock, handle)


def _finish_swap(place: Path) -> None:
    """Put a report where the journal says it belongs, if none stands there: the new one, or else the old one."""
    if not (place / JOURNAL).exists():
        return
    try:
        name = json.loads((place / JOURNAL).read_text(encoding="utf-8"))["report"]
    except (ValueError, KeyError, TypeError):
        return  # no swap was begun: the journal is whole on the disk before the first rename
    if not isinstance(name, str) or Path(name).name != name:
        return
    folder = place.parent / name
    for candidate in (place / NEW, place / OLD):
        if candidate.is_dir() and not os.path.lexists(folder):
            os.rename(candidate, folder)
