"""Everything a report folder holds, as bytes by path, before anything is written."""

from __future__ import annotations

from collections.abc import Callable

from reconcile.records.results import Audit
from reconcile.reporter import tables
from reconcile.reporter.drawn import draw_all
from reconcile.reporter.lookups import Lookups
from reconcile.reporter.previous import COPY
from reconcile.reporter.to_csv import table_csv
from reconcile.reporter.to_html import page
from reconcile.reporter.to_json import findings_json
from reconcile.reporter.to_xlsx import workbook


def contents(audit: Audit, progress: Callable[[str, float], None]) -> dict[str, bytes]:
    """Path within the folder (forward slashes) -> content, the manifest apart."""
    lookups = Lookups(audit)
    files: dict[str, bytes] = {}
    progress("writing tables", 0.0)
    residuals = tables.residuals(audit, lookups)
    for table in (residuals, tables.set_aside(audit)):
        files[f"{table.name}.csv"] = table_csv(table)
    files["findings.json"] = findings_json(audit)
    if audit.before is not None:
        files[COPY] = audit.before.content
    progress("writing the workbook", 0.1)
    files["residuals.xlsx"] = workbook(audit, lookups, residuals)
    drawn = draw_all(audit, lookups, lambda what, share: progress(what, 0.35 + 0.5 * share))
    for picture in drawn:
        files[f"plots/{picture.name}.png"] = picture.png
        files[f"plots/{picture.name}.svg"] = picture.svg
    progress("setting the page", 0.9)
    files["report.html"] = page(audit, lookups, residuals, drawn)
    progress("writing the folder", 0.98)
    return files
