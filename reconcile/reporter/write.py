"""The report folder: written beside its place, then renamed into it, so that there is a whole folder or nothing."""

from __future__ import annotations

import contextlib
import json
import os
import secrets
import shutil
from collections.abc import Callable, Mapping
from pathlib import Path

from reconcile.records.meter_results import MeterHistory
from reconcile.records.pka_results import PkaFit
from reconcile.records.results import Audit
from reconcile.reporter.contents import contents
from reconcile.reporter.manifest import AUDIT, MANIFEST, manifest
from reconcile.reporter.meter_contents import METERS, meter_contents
from reconcile.reporter.pka_contents import pka_contents
from reconcile.reporter.pka_gist import command as pka_command

Progress = Callable[[str, float], None]
"""Called with what is being done and the share done, 0 to 1."""
LITTER = frozenset({".DS_Store", "Thumbs.db", "desktop.ini"})


class ReportExists(FileExistsError):
    """There is something at the place of the report that must not be replaced without being told to, or at all."""


def write_report(
    result: Audit | MeterHistory | PkaFit,
    out: Path | str,
    *,
    replace: bool = False,
    progress: Progress | None = None,
) -> Path:
    """Write the whole report folder and return its path.

    Parameters
    ----------
    result : what `reconcile.audit`, `reconcile.meters` or `reconcile.fit_pka` gave
    out : folder to make; its parents are made too
    replace : an existing report (or an empty folder) is replaced; anything else at that place never is
    progress : told what is being done

    Raises
    ------
    ReportExists : `out` exists and `replace` is False, or it is not a report that this program wrote
    OSError : the folder cannot be written; then nothing is left behind
    """
    folder = Path(out).resolve()
    check_place(folder, replace)
    say = progress or (lambda _what, _share: None)
    if isinstance(result, MeterHistory):
        files, command = meter_contents(result, say), METERS
    elif isinstance(result, PkaFit):
        files, command = pka_contents(result, say), pka_command(result)
    else:
        files, command = contents(result, say), AUDIT
    files[MANIFEST] = manifest(result, files, command=command)
    _put(folder, files, replace)
    return folder


def check_place(folder: Path, replace: bool) -> None:
    """Refuse, before any work is done, a place that may not be written to; raises ReportExists."""
    if not os.path.lexists(folder):
        return
    if not folder.is_dir():
        raise ReportExists(f"{folder} is a file, not a folder; name another place with --out")
    held = {p.relative_to(folder).as_posix() for p in folder.rglob("*") if not p.is_dir() and p.name not in LITTER}
    if not held:
        if replace or not any(folder.iterdir()):
            return
        raise ReportExists(f"{folder} holds other folders; name another place with --out")
    known = _written_before(folder)
    if known is None:
        raise ReportExists(f"{folder} holds other files and no report; name another place with --out")
    if not replace:
        raise ReportExists(f"{folder} already holds a report; replace it with --replace, or name another with --out")
    foreign = sorted(held - known)
    if foreign:
        raise ReportExists(
            f"{folder} holds files that are no part of its report ({foreign[0]}"
            + (f" and {len(foreign) - 1} more" if len(foreign) > 1 else "")
            + "); move them first, or name another place with --out"
        )


def _written_before(folder: Path) -> set[str] | None:
    """Files of the report in a folder, by its manifest; None when there is no such report."""
    try:
        document = json.loads((folder / MANIFEST).read_text(encoding="utf-8"))
        if "report_id" not in document:
            return None
        return {MANIFEST, *(str(output["name"]) for output in document["outputs"])}
    except (OSError, ValueError, KeyError, TypeError):
        return None


def _put(folder: Path, files: Mapping[str, bytes], replace: bool) -> None:
    mark = secrets.token_hex(4)
    made = _make_parents(folder.parent)
    new = folder.parent / f".{folder.name}.{mark}.new"
    old = folder.parent / f".{folder.name}.{mark}.old"
    moved = False
    try:
        new.mkdir()
        for name, content in files.items():
            _write(new / name, content)
        for inside in sorted({(new / name).parent for name in files}):
            _sync_folder(inside)
        check_place(folder, replace)  # the place may have been filled while we worked
        if os.path.lexists(folder):
            os.rename(folder, old)
            moved = True
        os.rename(new, folder)
        _sync_folder(folder.parent)
    except BaseException:
        if moved and not os.path.lexists(folder):
            os.rename(old, folder)
        shutil.rmtree(new, ignore_errors=True)
        for parent in reversed(made):
            with contextlib.suppress(OSError):
                parent.rmdir()
        raise
    if moved:
        shutil.rmtree(old)


def _make_parents(folder: Path) -> list[Path]:
    missing = [p for p in (folder, *folder.parents) if not p.exists()][::-1]
    for parent in missing:
        parent.mkdir(exist_ok=True)
    return missing


def _write(path: Path, content: bytes) -> None:
    path.parent.mkdir(parents=True, exist_ok=True)
    with path.open("xb") as file:
        file.write(content)
        file.flush()
        os.fsync(file.fileno())


def _sync_folder(folder: Path) -> None:
    """Make the folder's entries durable, where the system lets a folder be opened."""
    if os.name != "posix":
        return
    handle = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)
