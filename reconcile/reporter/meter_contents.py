"""Everything the report folder of meters through time holds, as bytes by path."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from reconcile.records.meter_results import MeterHistory
from reconcile.reporter import meter_tables
from reconcile.reporter.drawn import Drawn
from reconcile.reporter.figures.calibration_course import calibration_course
from reconcile.reporter.figures.mandel import mandel
from reconcile.reporter.figures.residuals_time import residuals_time
from reconcile.reporter.figures.since_calibration import since_calibration
from reconcile.reporter.figures.style import styled
from reconcile.reporter.lookups import Lookups
from reconcile.reporter.meter_page import METERS, meter_page
from reconcile.reporter.plain import plain
from reconcile.reporter.to_csv import table_csv
from reconcile.reporter.to_png import images
from reconcile.reporter.words import counted, moment

MOST_COURSES = 60
"""Meters and probes that get a picture of their calibrations, in order of name."""
TABLES = (
    meter_tables.meters,
    meter_tables.calibrations,
    meter_tables.lines,
    meter_tables.crossings,
    meter_tables.steps,
    meter_tables.agreement,
    meter_tables.since_calibration,
    meter_tables.set_aside,
)
"""Builders of the CSV files; each file bears the name of its table."""


def meter_contents(history: MeterHistory, progress: Callable[[str, float], None]) -> dict[str, bytes]:
    """Path within the folder (forward slashes) -> content, the manifest apart."""
    progress("writing tables", 0.0)
    files = {}
    for build in TABLES:
        table = build(history)
        files[f"{table.name}.csv"] = table_csv(table)
    drawn = draw_all(history, lambda what, share: progress(what, 0.1 + 0.7 * share))
    for picture in drawn:
        files[f"plots/{picture.name}.png"] = picture.png
        files[f"plots/{picture.name}.svg"] = picture.svg
    progress("setting the page", 0.9)
    files["meters.html"] = meter_page(history, drawn)
    progress("writing the folder", 0.98)
    return files


def subjects(history: MeterHistory) -> list[tuple[str, str]]:
    """(name, "meter" or "probe") of everything with dated calibrations, meters first."""
    found = dict.fromkeys((x.subject, x.subject_type) for x in history.lines if len(x.calibration))
    return list(found)


def draw_all(history: MeterHistory, progress: Callable[[str, float], None]) -> list[Drawn]:
    """A picture of the calibrations of each meter and probe, then those of the readings."""
    shown = subjects(history)[:MOST_COURSES]
    found = []
    with styled():
        for i, (subject, kind) in enumerate(shown):
            progress(f"drawing calibrations {i + 1} of {len(shown)}", i / (len(shown) + 3))
            png, svg = images(calibration_course(history, subject, kind))
            lines = [x for x in history.lines if (x.subject, x.subject_type) == (subject, kind) and len(x.calibration)]
            own = len(set(np.concatenate([x.calibration for x in lines]).tolist()))
            dates = " to ".join(moment(t)[:10] for t in (min(x.first for x in lines), max(x.last for x in lines)))
            heading = f"{kind[:1].upper()}{kind[1:]} {plain(subject)}"
            alt = (
                f"Slope and offset of {counted(own, 'calibration')} of {kind} {plain(subject)} against time, with "
                "limits and fitted lines. The values are in the table of lines and in calibrations.csv."
            )
            found.append(
                Drawn(f"calibrations_{i + 1}", heading, f"{counted(own, 'calibration')}, {dates}.", alt, png, svg)
            )
        if history.audit is not None:
            found += _of_readings(history, Lookups(history.audit), progress)
    return found


def _of_readings(history: MeterHistory, lookups: Lookups, progress: Callable[[str, float], None]) -> list[Drawn]:
    found = []
    progress("drawing residuals through time", 0.85)
    png, svg = images(residuals_time(lookups.audit, lookups))
    found.append(
        Drawn(
            "residuals_time",
            "Residual through time, by meter",
            "One strip a meter, all on one scale, with what findings about other subjects account for taken out; the "
            "band is twice the median spread of a clean record.",
            "Residual against time, one strip for each meter. The values are in since_calibration.csv.",
            png,
            svg,
        )
    )
    if any(not b.reason for b in history.between):
        png, svg = images(since_calibration(history, lookups))
        found.append(
            Drawn(
                "since_calibration",
                "Residual against days since calibration, by meter",
                "Drawn through the middle of each meter’s readings; the band holds the 95 % interval of the rate. A "
                "rate that comes back to nought at each calibration makes a saw-tooth in time.",
                "Residual against days since the meter’s calibration, one strip for each meter, with the rate that "
                "the model gives. The values are in since_calibration.csv.",
                png,
                svg,
            )
        )
    if history.agreement:
        png, svg = images(mandel(history))
        found.append(
            Drawn(
                "agreement",
                "Mandel’s h and k, by meter",
                "h: how far a meter’s mean lies from the others’, in their standard deviations; the lines hold for the "
                "commonest number of meters on a solution. k: its scatter over the pooled one; what chance gives "
                "depends on the number of readings and is in the table. A mark that is beyond is beyond its own value.",
                "Mandel’s h and k of each meter, one mark a solution. The values are in the table of agreement.",
                png,
                svg,
            )
        )
    return found


__all__ = ["METERS", "draw_all", "meter_contents"]
