"""Results of looking at meters and probes through time. Frozen, without behaviour beyond look-ups."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields
from typing import TYPE_CHECKING, Any

import numpy as np

from reconcile.records.arrays import FloatArray, IntArray
from reconcile.records.book import BatchRecords
from reconcile.records.results import Audit, Finding
from reconcile.records.settings import Settings

if TYPE_CHECKING:
    import pandas as pd

QUANTITIES = {"slope": "%", "offset": "mV"}
"""What a calibration reports of an electrode, with its unit."""


@dataclass(frozen=True)
class Limit:
    """One limit of a calibration's slope or offset.

    side : "low" or "high"; value in the quantity's unit
    judged : False for a limit of another text, shown beside and not counted by
    """

    quantity: str
    side: str
    value: float
    source: str
    judged: bool = True


@dataclass(frozen=True)
class Line:
    """The straight line through the calibrations of one meter or probe between two events.

    subject, subject_type : meter or probe; probe : the one in use, "" where none is named
    quantity : "slope" [%] or "offset" [mV]; all values are in its unit
    begun_by : event or change with which this run of calibrations began, "" for the first
    calibration : IntArray (m,), rows of the calibrations table, in order of time
    first, last : times of the first and last; middle : mean time, where the line has the value `level`
    rate, rate_interval95 : least squares, per 30 days; robust_rate, robust_interval95 : Theil and Sen, the same unit
    sd : standard deviation about the line; at_last : the line's value at the last calibration
    outside : calibrations outside the limits of the settings
    latest : True for the run that is not yet ended by an event
    reason : why there is no line, "" when there is one; its numbers are then NaN
    """

    subject: str
    subject_type: str
    probe: str
    quantity: str
    begun_by: str
    calibration: IntArray
    first: np.datetime64
    last: np.datetime64
    middle: np.datetime64
    level: float
    rate: float
    rate_interval95: tuple[float, float]
    robust_rate: float
    robust_interval95: tuple[float, float]
    sd: float
    at_last: float
    outside: int
    latest: bool
    reason: str = ""


@dataclass(frozen=True)
class Crossing:
    """When the latest line of a subject crosses a limit; NaT where the calibrations give no such date.

    at : date of the fitted line; earliest, latest : 95 % interval of the date on which the true line crosses, in whole
        days outwards
    ahead : crossing lies after the last calibration
    text : in words
    """

    subject: str
    subject_type: str
    probe: str
    quantity: str
    limit: Limit
    at: np.datetime64
    earliest: np.datetime64
    latest: np.datetime64
    ahead: bool
    text: str


@dataclass(frozen=True)
class CalibrationStep:
    """A jump between two calibrations that no logged event explains: after minus before, in the quantity's unit.

    earliest, latest : 95 % interval of its date; family_wise_p : over all dates, meters and quantities looked at
    """

    subject: str
    subject_type: str
    probe: str
    quantity: str
    size: float
    interval95: tuple[float, float]
    earliest: np.datetime64
    latest: np.datetime64
    family_wise_p: float


@dataclass(frozen=True)
class BetweenCalibrations:
    """How a meter's residuals go with the days since its calibration [pH/day]; what else is known is allowed for.

    reason : why there is no rate, "" when there is one
    """

    meter: str
    readings: int
    sessions: int
    longest_days: float
    rate: float
    interval95: tuple[float, float]
    reason: str = ""


@dataclass(frozen=True)
class MeterNoise:
    """Standard deviation of a meter's reading noise [pH] with its interval; df: effective degrees of freedom."""

    meter: str
    readings: int
    sd: float
    interval95: tuple[float, float]
    df: float
    reason: str = ""


@dataclass(frozen=True)
class Agreement:
    """One meter on one solution that at least four meters read, compared with the others (ISO 5725-2).

    solution : batch or known solution, with lot and stage; "whole record" for the meters' means over all solutions
    readings, mean, sd : of its residuals there [pH]; sd NaN for a single reading
    from_centre : mean minus the robust centre of the meters' means (ISO 13528, Algorithm A) [pH]
    centre, spread : that centre and the robust standard deviation about it [pH]
    h, k : Mandel's statistics; h_5, h_1, k_5, k_1 : values passed by chance in 5 % and 1 %
    """

    solution: str
    meter: str
    meters: int
    readings: int
    mean: float
    sd: float
    from_centre: float
    centre: float
    spread: float
    h: float
    h_5: float
    h_1: float
    k: float
    k_5: float
    k_1: float


WHOLE_RECORD = "whole record"


@dataclass(frozen=True)
class MeterHistory:
    """Meters and probes through time: the record, the audit of its readings, and what calibrations and readings show.

    audit : None where the record holds no used reading
    days_since : FloatArray (n,), days from the meter's last calibration to each reading; NaN where unknown
    not_shown : (what, why) of each part that this record cannot give
    """

    records: BatchRecords
    settings: Settings
    audit: Audit | None
    meters: tuple[str, ...]
    probes: tuple[str, ...]
    limits: tuple[Limit, ...]
    lines: tuple[Line, ...]
    crossings: tuple[Crossing, ...]
    calibration_steps: tuple[CalibrationStep, ...]
    between: tuple[BetweenCalibrations, ...]
    noise: tuple[MeterNoise, ...]
    agreement: tuple[Agreement, ...]
    days_since: FloatArray
    not_shown: tuple[tuple[str, str], ...]

    @property
    def rows(self) -> dict[str, int]:
        """Rows of readings read, used and set aside; read = used + set aside."""
        return {
            "read": self.records.rows_read,
            "used": len(self.records.readings),
            "set_aside": len(self.records.set_aside),
        }

    @property
    def findings(self) -> tuple[Finding, ...]:
        """The audit's findings about meters, probes and calibration buffers, most supported first."""
        if self.audit is None:
            return ()
        return tuple(f for f in self.audit.findings if f.subject_type in ("meter", "probe", "calibration", "buffer"))

    @property
    def flagged(self) -> bool:
        """Whether anything is a lead: a calibration outside the limits, an unlogged step, a finding about a meter."""
        return any(line.outside for line in self.lines) or bool(self.calibration_steps) or bool(self.findings)

    @property
    def lines_table(self) -> pd.DataFrame:
        """The lines as a pandas frame, one row a run of calibrations and quantity."""
        return _frame(self.lines, Line)

    @property
    def crossings_table(self) -> pd.DataFrame:
        """The crossing dates as a pandas frame."""
        return _frame(self.crossings, Crossing)

    @property
    def steps_table(self) -> pd.DataFrame:
        """The unlogged steps between calibrations as a pandas frame."""
        return _frame(self.calibration_steps, CalibrationStep)

    @property
    def between_table(self) -> pd.DataFrame:
        """Rates between calibrations as a pandas frame, one row a meter."""
        return _frame(self.between, BetweenCalibrations)

    @property
    def noise_table(self) -> pd.DataFrame:
        """Reading noise as a pandas frame, one row a meter."""
        return _frame(self.noise, MeterNoise)

    @property
    def agreement_table(self) -> pd.DataFrame:
        """Agreement as a pandas frame, one row a meter and solution."""
        return _frame(self.agreement, Agreement)


def _frame(rows: Sequence[Any], kind: type) -> pd.DataFrame:
    import pandas as pd

    names = [f.name for f in fields(kind)]
    return pd.DataFrame([{name: getattr(row, name) for name in names} for row in rows], columns=names)
