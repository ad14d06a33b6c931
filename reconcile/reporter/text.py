"""The gist as plain lines for a terminal."""

from __future__ import annotations

from reconcile.records.results import Audit
from reconcile.reporter.cautions import CAUTIONS
from reconcile.reporter.gist import gist
from reconcile.reporter.lookups import Lookups
from reconcile.reporter.plain import plain
from reconcile.reporter.previous import lines as previous_lines
from reconcile.reporter.stocks import stocks
from reconcile.reporter.words import brief_since, counted, listed, size_words, title

MOST_FINDINGS = 12
MOST_LOTS = 4


def gist_lines(audit: Audit) -> list[str]:
    """The five lines of the gist, "label: text", without control characters."""
    return [f"{line.label}: {line.text}" for line in gist(audit, Lookups(audit))]


def gist_rows(audit: Audit) -> list[tuple[str, str]]:
    """The gist as rows (label, text); each finding has a row of its own, with its interval and its rivals."""
    rows = []
    for line in gist(audit, Lookups(audit)):
        if line.key == "previous" and audit.before is not None:
            rows.append((line.label, f"against report {plain(audit.before.report_id)}"))
            rows += [("", f"{what}  {text}") for what, text in previous_lines(audit.before)]
            continue
        rows.append((line.label, line.lead if line.items else line.text))
        if line.items:
            rows += [("", text) for text in finding_lines(audit)]
    return rows


def finding_lines(audit: Audit) -> list[str]:
    """One line a finding: id, what, how large, since when, number of rivals; at most twelve."""
    lines = []
    faults = [finding for _, finding in Lookups(audit).faults]
    for finding in faults[:MOST_FINDINGS]:
        rivals = f"{counted(len(finding.rivals), 'rival')} in report.html" if finding.rivals else ""
        parts = (title(finding), size_words(finding), brief_since(finding), rivals)
        lines.append(f"{plain(finding.id)}  {', '.join(filter(None, parts))}")
    more = len(faults) - MOST_FINDINGS
    return [*lines, f"and {counted(more, 'more finding')} in report.html"] if more > 0 else lines


def hazard_lines(audit: Audit) -> list[str]:
    """Hazard words of every substance, with the lots it came from; none with words recorded is ever left out."""
    lots: dict[tuple[str, str, bool], list[str]] = {}
    for stock in stocks(audit):
        none = not (stock.words or stock.gas)
        lots.setdefault((stock.substance, stock.hazard, none), []).append(stock.lot)
    lines = []
    for (substance, hazard, _), names in sorted(lots.items(), key=lambda item: (item[0][2], item[0])):
        known = [n for n in names if n]
        named = f" ({listed([f'lot {n}' for n in known], MOST_LOTS)})" if known else ""
        lines.append(f"{substance}{named}: {hazard}")
    return lines


def caution_lines() -> list[str]:
    """The cautions, a sentence or two each."""
    return list(CAUTIONS)
