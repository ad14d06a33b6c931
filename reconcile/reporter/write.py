"""The report of a result as a folder: which files, and whether its place may be taken."""

from __future__ import annotations

import json
import os
from collections.abc import Callable
from dataclasses import asdict
from pathlib import Path

from reconcile.records.meter_results import MeterHistory
from reconcile.records.pka_results import PkaFit
from reconcile.records.results import Audit
from reconcile.reporter.contents import contents
from reconcile.reporter.folder import put_folder
from reconcile.reporter.manifest import AUDIT, MANIFEST, manifest
from reconcile.reporter.meter_contents import METERS, meter_contents
from reconcile.reporter.pka_contents import pka_contents
from reconcile.reporter.pka_gist import command as pka_command
from reconcile.reporter.working_place import settle

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
    files = report_files(result, progress or (lambda _what, _share: None))
    put_folder(folder, files, lambda: _check(folder, replace))
    return folder


def report_files(result: Audit | MeterHistory | PkaFit, progress: Progress) -> dict[str, bytes]:
    """Everything that the folder of a report holds: path within it, with forward slashes -> content."""
    question = None
    if isinstance(result, MeterHistory):
        files, command = meter_contents(result, progress), METERS
    elif isinstance(result, PkaFit):
        files, command, question = pka_contents(result, progress), pka_command(result), asdict(result.question)
    else:
        files, command = contents(result, progress), AUDIT
    files[MANIFEST] = manifest(result, files, command=command, question=question)
    return files


def check_place(folder: Path, replace: bool) -> None:
    """Refuse, before any work is done, a place that may not be written to; raises ReportExists.

    What a killed run left at that place or beside it is put in order first.
    """
    settle(Path(os.path.abspath(folder)).parent)
    _check(folder, replace)


def _check(folder: Path, replace: bool) -> None:
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
