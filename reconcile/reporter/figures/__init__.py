"""Pictures of an audit: one file each, one row each in this table; adding one touches its file and a row here."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

from matplotlib.figure import Figure

from reconcile.records.results import Audit
from reconcile.reporter.figures.detectable import detectable
from reconcile.reporter.figures.meter_lot import MOST, meter_lot
from reconcile.reporter.figures.predicted_observed import predicted_observed
from reconcile.reporter.figures.residuals_lots import MOST_LOTS, residuals_lots
from reconcile.reporter.figures.residuals_time import MOST_METERS, residuals_time
from reconcile.reporter.lookups import Lookups


@dataclass(frozen=True)
class Picture:
    """One picture: how it is drawn, its heading and caption, and what a reader who cannot see it is told.

    rest : says what of a large record the picture leaves out, "" when nothing
    """

    draw: Callable[[Audit, Lookups], Figure]
    heading: str
    caption: str
    alt: str
    rest: Callable[[Audit, Lookups], str] = lambda _audit, _lookups: ""


def _rest(number: int, shown: int, what: str) -> str:
    return f"Shown are {shown} of {number:,} {what}, the most used." if number > shown else ""


PICTURES: Mapping[str, Picture] = {
    "predicted_observed": Picture(
        predicted_observed,
        "Observed against predicted",
        "Left: each mark is one reading, the line is agreement. Right: the same readings as differences; the band is "
        "twice the median spread of a clean record. A caret at the edge is a reading beyond the scale, with its value.",
        "Two scatter plots: observed against predicted pH with the line of agreement, and the residual against "
        "predicted pH. The values are in the table of residuals.",
    ),
    "residuals_time": Picture(
        residuals_time,
        "Residual through time, by meter",
        "One strip a meter, all on one scale, with what findings about other subjects account for taken out; the band "
        "is twice the median spread of a clean record. Readings as recorded are in the table of residuals.",
        "Residual against time, one strip for each meter. The values are in the table of residuals.",
        lambda audit, lookups: _rest(len(set(lookups.meter.tolist())), MOST_METERS, "meters"),
    ),
    "residuals_lots": Picture(
        residuals_lots,
        "Residual by stock lot",
        "Every reading counts once for each lot its solution rests on. What findings about other subjects account for "
        "is taken out, so that one bad lot does not show on the lots it was used with.",
        "Residuals of the readings that rest on each stock lot, sorted by their mean. "
        "Means as recorded are in the table of stocks.",
        lambda audit, lookups: _rest(len(audit.records.lots), MOST_LOTS, "lots"),
    ),
    "meter_lot": Picture(
        meter_lot,
        "Mean residual by meter and lot",
        "As recorded, nothing taken out: a fault of a meter shows along its row, a fault of a lot down its column and, "
        "more weakly, in the columns of the lots it was used with.",
        "Grid of the mean residual of each meter on each stock lot, with the number of readings.",
        lambda audit, lookups: " ".join(
            filter(
                None,
                (
                    _rest(len(set(lookups.meter.tolist())), MOST, "meters"),
                    _rest(len(audit.records.lots), MOST, "lots"),
                ),
            )
        ),
    ),
    "smallest_detectable": Picture(
        detectable,
        "Smallest detectable fault",
        "A fault smaller than its mark may be in the record without a finding. Factors hold in both directions.",
        "Smallest detectable fault of each meter and lot. The values are in the tables of meters and of stocks.",
    ),
}
"""Name (and file stem) -> picture, in the order of the page."""
