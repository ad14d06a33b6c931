"""Which readings belong to which meter, lot or finding: the look-ups that tables, figures and page share."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from reconcile.records.arrays import AnyArray, BoolArray, FloatArray, IntArray, TextArray
from reconcile.records.results import Audit, Finding
from reconcile.reporter.plain import plain

FLAGGED = ("stands_out", "explained")
CALCULATION = "record_value"
"""Kind of finding that is about the record's own calculated pH, not about a reading."""
METER_TYPES = ("meter", "probe", "calibration")


def plain_all(texts: Iterable[object]) -> TextArray:
    """An array of plain texts."""
    return np.array([plain(str(t)) for t in texts], object)


@dataclass(frozen=True)
class Lookups:
    """Look-ups on one audit, each made once when first asked for."""

    audit: Audit

    @cached_property
    def batch(self) -> TextArray:
        """(n,) what was read: the batch, or the known solution."""
        readings = self.audit.records.readings
        return plain_all(np.where(readings["batch"] == "", readings["known"], readings["batch"]))

    @cached_property
    def meter(self) -> TextArray:
        """(n,) meter, "" where none is named."""
        return plain_all(self.audit.records.readings["meter"])

    @cached_property
    def lot_names(self) -> TextArray:
        """(l,) lot names."""
        return plain_all(self.audit.records.lots.name)

    @cached_property
    def reading_lots(self) -> tuple[IntArray, IntArray]:
        """Pairs (reading, lot): every lot that the solution of a reading rests on, sorted by reading, each once."""
        records = self.audit.records
        solutions, lots = records.solutions, max(len(records.lots), 1)
        owner = solutions.solution[solutions.chain_contribution]
        pairs = np.unique(owner.astype(np.int64) * lots + solutions.chain_lot)
        owner, lot = pairs // lots, pairs % lots
        first = np.searchsorted(owner, records.readings_solution, "left")
        count = np.searchsorted(owner, records.readings_solution, "right") - first
        reading = np.repeat(np.arange(len(records.readings)), count)
        within = np.arange(len(reading)) - np.repeat(np.cumsum(count) - count, count)
        return reading, lot[np.repeat(first, count) + within]

    @cached_property
    def usable(self) -> BoolArray:
        """(n,) readings whose residual may enter a mean: evidence, with a residual."""
        return self.audit.evidence & np.isfinite(self.audit.residual)

    @cached_property
    def flagged(self) -> BoolArray:
        """(n,) readings that stand out or that a finding explains."""
        return np.isin(self.audit.status, FLAGGED)

    @cached_property
    def decimals(self) -> IntArray:
        """(n,) decimals of each meter's display, 2 where the resolution is unknown."""
        resolution: FloatArray = self.audit.records.readings["resolution"]
        known = np.isfinite(resolution) & (resolution > 0)
        places = np.ceil(-np.log10(np.where(known, resolution, 0.01)) - 1e-9)
        return np.clip(places, 0, 4).astype(np.intp)

    @cached_property
    def times(self) -> AnyArray:
        """(n,) when each reading was made, datetime64[s]."""
        return self.audit.records.readings["read_at"].astype("datetime64[s]")

    @cached_property
    def main_sheet(self) -> int:
        """The sheet that most readings stand in; rows of other sheets are named with their sheet."""
        sheets = self.audit.records.readings.source
        return int(np.argmax(np.bincount(sheets))) if len(sheets) else -1

    def row_words(self, reading: int) -> str:
        """Row of a reading as the page names it: "154", in a second sheet "Checks 33"."""
        records = self.audit.records
        source, row = int(records.readings.source[reading]), int(records.readings.row[reading])
        if source == self.main_sheet:
            return str(row)
        sheet = records.sheets[source]
        return f"{plain(sheet.sheet or sheet.file)} {row}"

    def place_words(self, reading: int) -> str:
        """Place of a reading in a sentence: "row 154", in a second sheet "Checks, row 33"."""
        row, words = str(int(self.audit.records.readings.row[reading])), self.row_words(reading)
        return f"row {row}" if words == row else f"{words.removesuffix(row).rstrip()}, row {row}"

    def before_onset(self, finding: Finding) -> int | None:
        """Last reading of a meter or probe before a fault of it began; None where there is none, or no onset."""
        if finding.since is None or finding.subject_type not in METER_TYPES or not isinstance(finding.subject, str):
            return None
        name = "probe" if finding.subject_type == "probe" else "meter"
        own = np.flatnonzero((self.audit.records.readings[name] == finding.subject) & self.usable)
        own = own[self.times[own] < np.datetime64(finding.since, "s")]
        return int(own[np.argmax(self.times[own])]) if len(own) else None

    @cached_property
    def period(self) -> tuple[np.datetime64, np.datetime64] | None:
        """First and last time of a reading; None when no reading has one."""
        known = self.times[~np.isnat(self.times)]
        return (known.min(), known.max()) if len(known) else None

    def of_subject(self, finding: Finding) -> IntArray:
        """Readings of a finding's subject: all of that meter, probe, lot or batch; else those it rests on."""
        readings, kind = self.audit.records.readings, finding.subject_type
        own = np.asarray(finding.readings, np.intp)
        subject = finding.subject if isinstance(finding.subject, str) else finding.subject[0]
        if kind in METER_TYPES:
            name = "probe" if kind == "probe" else "meter"
            chosen = np.flatnonzero(readings[name] == subject)
        elif kind == "lot":
            reading, lot = self.reading_lots
            chosen = reading[np.isin(lot, np.flatnonzero(self.audit.records.lots.name == subject))]
        elif kind in ("batch", "reading") and subject:
            chosen = np.flatnonzero(readings["batch"] == subject)
        else:
            chosen = own
        return np.union1d(chosen, own).astype(np.intp)

    def part(self, finding: Finding) -> FloatArray:
        """(n,) part of each residual that a finding accounts for [pH]; 0 elsewhere."""
        part = np.zeros(len(self.audit.residual))
        own = np.asarray(finding.readings, np.intp)
        if len(finding.shift) == len(own):
            part[own] = np.where(np.isfinite(finding.shift), finding.shift, 0.0)
        return part

    @cached_property
    def all_parts(self) -> FloatArray:
        """(n,) part of each residual that all findings together account for [pH]."""
        return self._together(self.audit.findings)

    def _together(self, findings: Iterable[Finding]) -> FloatArray:
        whole = np.zeros(len(self.audit.residual))
        for finding in findings:
            whole += self.part(finding)
        return whole

    def apart_from_others(self, findings: Iterable[Finding]) -> FloatArray:
        """(n,) residual with what every other finding accounts for taken out, and these left in [pH]."""
        return self.audit.residual - (self.all_parts - self._together(findings))

    def about(self, name: str, types: tuple[str, ...]) -> list[Finding]:
        """Findings about one subject."""
        return [f for f in self.audit.findings if f.subject_type in types and f.subject == name]

    @cached_property
    def faults(self) -> list[tuple[int, Finding]]:
        """Findings about readings, each with its place in the audit."""
        return [(i, f) for i, f in enumerate(self.audit.findings) if f.kind != CALCULATION]

    @cached_property
    def calculations(self) -> list[tuple[int, Finding]]:
        """Findings about the record's own calculated pH, each with its place in the audit."""
        return [(i, f) for i, f in enumerate(self.audit.findings) if f.kind == CALCULATION]

    @cached_property
    def findings_of_meter(self) -> dict[str, list[str]]:
        """Meter name -> ids of findings about it."""
        return self._by_subject(METER_TYPES)

    @cached_property
    def findings_of_lot(self) -> dict[str, list[str]]:
        """Lot name -> ids of findings about it."""
        return self._by_subject(("lot",))

    def _by_subject(self, types: tuple[str, ...]) -> dict[str, list[str]]:
        found: dict[str, list[str]] = {}
        for finding in self.audit.findings:
            if finding.subject_type in types:
                subject = finding.subject if isinstance(finding.subject, str) else finding.subject[0]
                found.setdefault(plain(subject), []).append(plain(finding.id))
        return found

    @cached_property
    def shown_first(self) -> IntArray:
        """Order in which rows are shown when not all are: those that stand out first, then file order."""
        return np.argsort(~self.flagged, kind="stable")

    def smallest(self, types: tuple[str, ...], kinds: tuple[str, ...]) -> dict[str, float]:
        """Subject -> smallest detectable size of the first of the kinds that is stated for it."""
        found: dict[str, float] = {}
        for kind in kinds:
            for silence in self.audit.smallest_detectable:
                if silence.kind == kind and silence.subject_type in types and silence.size is not None:
                    found.setdefault(plain(silence.subject), silence.size)
        return found
