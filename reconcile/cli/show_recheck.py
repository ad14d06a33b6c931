"""What became of a report, as terminal text and as JSON."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from reconcile.cli.show import columns, heading, line
from reconcile.records.problems import shown

if TYPE_CHECKING:
    from reconcile.replay import FileCheck, InputCheck, Recheck

FIRST = 10
"""Differences of one file that are printed before the rest is only counted."""


def show(found: Recheck) -> None:
    """Inputs and files with their standing, every difference, and the sum of it in one line."""
    line(f"Report {found.report_id} in {found.folder}", bold=True)
    line(f"reconcile {found.command}, version {found.version}, written {found.written_at}")
    heading("Inputs")
    columns([(check.name, *_input(check)) for check in found.inputs])
    heading("Files")
    columns([(check.name, _file(check, bool(found.why_not))) for check in found.files])
    for check in found.files:
        if check.differences:
            heading(f"{check.name}: where it differs")
            rows = [(d.where, shown(d.reads), shown(d.recomputed)) for d in check.differences[:FIRST]]
            columns(rows, headings=("place", "reads", "recomputed"))
            if len(check.differences) > FIRST:
                line(f"and {len(check.differences) - FIRST:,} more", indent=2)
    if found.notes:
        heading("Notes")
        columns([(note,) for note in found.notes])
    line()
    line(verdict(found), bold=True)


def _input(check: InputCheck) -> tuple[str, str]:
    if not check.now:
        return "not found", f"its SHA-256 was {check.sha256}"
    if check.standing == "changed":
        return "changed", f"{check.found}: its SHA-256 was {check.sha256}, and is {check.now}"
    return "the same", check.found


def _file(check: FileCheck, as_listed: bool) -> str:
    if check.standing == "missing":
        return "missing"
    if as_listed:
        return "as the manifest has it" if check.as_written else "changed since it was written"
    if check.standing == "the same":
        return "as recomputed"
    number = len(check.differences)
    return f"differs in {number:,} place{'' if number == 1 else 's'} from what was recomputed"


def verdict(found: Recheck) -> str:
    """One sentence on the whole."""
    if found.holds:
        return "Everything holds: the inputs are the same, and every file and figure is what was recomputed."
    inputs = [x.name for x in found.inputs if x.standing != "the same"]
    files = [x.name for x in found.files if x.standing != "the same"]
    parts = []
    if found.why_not:
        parts.append(f"Nothing was recomputed: {found.why_not.rstrip('.')}.")
    if inputs:
        parts.append(f"No longer as they were: {', '.join(inputs)}.")
    if inputs and files and not found.why_not:
        parts.append(f"With the inputs as they are now, other figures come out in {', '.join(files)}.")
        written = [x.name for x in found.files if not x.as_written and x.name != "manifest.json"]
        if written:
            parts.append(f"Changed since they were written: {', '.join(written)}.")
    elif files:
        parts.append(f"No longer holds: {', '.join(files)}.")
    return " ".join(parts)


def document(found: Recheck) -> dict[str, Any]:
    """All of it as --json prints it."""
    return {
        "holds": found.holds,
        "verdict": verdict(found),
        "report_id": found.report_id,
        "command": found.command,
        "version": found.version,
        "written_at": found.written_at,
        "recomputed": not found.why_not,
        "why_not": found.why_not,
        "inputs": [
            {"name": x.name, "found": x.found, "standing": x.standing, "sha256": x.sha256, "sha256_now": x.now or None}
            for x in found.inputs
        ],
        "files": [
            {
                "name": x.name,
                "standing": x.standing,
                "as_written": x.as_written,
                "differences": [
                    {"where": d.where, "reads": d.reads, "recomputed": d.recomputed} for d in x.differences
                ],
            }
            for x in found.files
        ],
        "notes": list(found.notes),
    }
