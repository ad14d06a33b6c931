"""A map of columns begun for files in which no heading row was recognised."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from reconcile.importer.blocks import nearest_headings
from reconcile.importer.files import read_file
from reconcile.importer.toml_files import quoted
from reconcile.records.columns import BY_SHEET
from reconcile.records.settings import Settings

BEGIN = (
    "# Map of columns: heading as written = field. Name the field, take the # away, and move each line under the kind",
    "# of sheet that it stands on.",
)


def begun_map_text(paths: Sequence[Path], settings: Settings) -> str:
    """The texts of each sheet's row that looks most like a heading row, as lines to complete; and every field there is.

    Raises InputProblems where a file cannot be read at all.
    """
    lines = [*BEGIN, "", "[readings]"]
    for path in paths:
        for sheet in read_file(path, settings):
            headings = dict.fromkeys(" ".join(text.split()) for text in nearest_headings(sheet) if text.strip())
            if headings:
                lines.append(f"# {sheet.place().words()}:")
                lines += [f"# {quoted(heading)} = " for heading in headings]
    for kind, columns in BY_SHEET.items():
        lines += ["", f"# fields of [{kind}]: {', '.join(column.name for column in columns)}"]
    return "\n".join(lines) + "\n"
