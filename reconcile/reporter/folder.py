"""A folder that is there whole or not at all: written beside its place, made durable, then put there at one stroke."""

from __future__ import annotations

import contextlib
import os
from collections.abc import Callable, Mapping
from pathlib import Path

from reconcile.reporter.exchange import exchange
from reconcile.reporter.working_place import NEW, OLD, begin_swap, working_place


def put_folder(folder: Path, files: Mapping[str, bytes], may_stand: Callable[[], None]) -> None:
    """Write files into a folder, in place of the one that may be there.

    folder : absolute; parents are made
    files : path within the folder, with forward slashes -> content
    may_stand : called last before anything changes; raises where the place may not be taken

    Raises OSError, with the folder's name, where that fails; then the place is as it was and nothing is left beside it.
    """
    made: list[Path] = []
    try:
        _make_parents(folder.parent, made)
        with working_place(folder.parent) as place:
            new = place / NEW
            new.mkdir()
            for name, content in files.items():
                write_file(new / name, content)
            for inside in sorted({(new / name).parent for name in files} | {new, place}):
                sync_folder(inside)
            may_stand()
            undo = _into_place(place, folder)
            try:
                sync_folder(folder.parent)
            except OSError:
                undo()
                raise
    except OSError as error:
        _unmake(made)
        if isinstance(error, FileExistsError) and error.errno is None:
            raise  # the place may not be taken, in words of its own
        raise OSError(error.errno, error.strerror or str(error), str(folder)) from error
    except BaseException:
        _unmake(made)
        raise


def _into_place(place: Path, folder: Path) -> Callable[[], None]:
    """Put the new folder where it belongs; the one that was there is then in `place`. Gives what undoes it."""
    new, old = place / NEW, place / OLD
    if not os.path.lexists(folder):
        os.rename(new, folder)
        return lambda: os.rename(folder, new)
    if exchange(new, folder):
        return lambda: _exchanged_back(new, folder)
    begin_swap(place, folder)
    sync_folder(place)
    try:
        os.rename(folder, old)
        os.rename(new, folder)
    except BaseException:
        if old.exists() and not os.path.lexists(folder):
            os.rename(old, folder)
        raise

    def back() -> None:
        os.rename(folder, new)
        os.rename(old, folder)

    return back


def _exchanged_back(new: Path, folder: Path) -> None:
    exchange(new, folder)


def _make_parents(folder: Path, made: list[Path]) -> None:
    for parent in [p for p in (folder, *folder.parents) if not p.exists()][::-1]:
        parent.mkdir(exist_ok=True)
        made.append(parent)


def _unmake(made: list[Path]) -> None:
    for parent in reversed(made):
        with contextlib.suppress(OSError):  # somebody else's file is in it by now
            parent.rmdir()


def write_file(path: Path, content: bytes) -> None:
    """Write a new file and wait until it is on the disk."""
    path.parent.mkdir(parents=True, exist_ok=True)
    with path.open("xb") as file:
        file.write(content)
        file.flush()
        os.fsync(file.fileno())


def sync_folder(folder: Path) -> None:
    """Make the folder's entries durable, where the system lets a folder be opened."""
    if os.name != "posix":
        return
    handle = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)
