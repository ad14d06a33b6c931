"""Results that pass between rooms: predictions, findings, audits. Frozen, without behaviour beyond look-ups."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from datetime import datetime
from typing import TYPE_CHECKING, Any

import numpy as np

from reconcile.records.arrays import BoolArray, FloatArray, IntArray, TextArray, TimeArray, Triplets
from reconcile.records.settings import Settings

if TYPE_CHECKING:
    import pandas as pd

    from reconcile.records.book import BatchRecords
    from reconcile.records.over_time import Before


@dataclass(frozen=True)
class Prediction:
    """Predicted pH of n solutions, with what an audit needs to know about each.

    ph : FloatArray (n,)                 -log10 of the hydrogen-ion activity; NaN where not solved
    status : TextArray (n,)              "ok", "outside_model", "outside_electrode_range", "unbuffered", "not_solved"
    u : FloatArray (n,)                  standard uncertainty of the prediction [pH]
    budget : name -> FloatArray (n,)     its parts, root-sum-square gives u: "strength", "taking", "temperature",
                                         "pKa", "activity model", "carbon dioxide" (for known solutions "certificate")
    ionic_strength : FloatArray (n,)     [mol/kg]
    buffer_capacity : FloatArray (n,)    [mol/L per pH], positive
    temperature_c : FloatArray (n,)      temperature predicted at [°C]
    d_temperature : FloatArray (n,)      dpH/dT [1/K]
    d_model : FloatArray (n,)            dpH per unit of the activity model's uncertain coefficient; its u is u_model
    d_titrant : FloatArray (n,)          dpH per mol/L of strong base added [L/mol]
    contributions : Triplets (n, c)      dpH/d ln(amount) for each contribution (a column of amounts in predict_ph)
    constants : Triplets (n, q)          dpH/d pKa for each ionization constant met
    constant_names : ((acid, step), ...) (q,)
    constant_u : FloatArray (q,)         standard uncertainty of each constant at 25 °C
    u_model : float                      standard uncertainty of the activity model's coefficient
    degree : Triplets (n, a)             protons lost by each acid over those it can lose
    acid_names : (a,)
    """

    ph: FloatArray
    status: TextArray
    u: FloatArray
    budget: Mapping[str, FloatArray]
    ionic_strength: FloatArray
    buffer_capacity: FloatArray
    temperature_c: FloatArray
    d_temperature: FloatArray
    d_model: FloatArray
    d_titrant: FloatArray
    contributions: Triplets
    constants: Triplets
    constant_names: tuple[tuple[str, int], ...]
    constant_u: FloatArray
    u_model: float
    degree: Triplets
    acid_names: tuple[str, ...]

    def __len__(self) -> int:
        return len(self.ph)


@dataclass(frozen=True)
class Change:
    """A supposed other truth for some readings: what the auditor asks the prediction engine to try.

    rows : IntArray (m,)            readings to predict again
    contributions : IntArray (j,)   contributions that change
    form : str                      name of the form supposed in their place; "" keeps the form
    factor : FloatArray (j,)        amount multiplied by this (after a change of form at equal mol, or at equal mass
                                    where the contribution was weighed and `at_equal_mass`)
    at_equal_mass : bool            weighed contributions keep their mass, so their mol follow the molar masses
    dissolved_co2 : float           added dissolved carbon dioxide [mol/kg]
    """

    rows: IntArray
    contributions: IntArray
    form: str = ""
    factor: FloatArray = field(default_factory=lambda: np.ones(0))
    at_equal_mass: bool = False
    dissolved_co2: float = 0.0


COULD_ALSO_BE = "It could also be: "
"""Begins the sentence of a finding's text that names its rivals; left out where they are listed beside it."""
Repredict = Callable[[Sequence[Change]], list[Prediction]]
"""Given by the pipeline to the auditor: one Prediction (m_i rows) for every change, all solved together."""


@dataclass(frozen=True)
class Finding:
    """One supported explanation, or one of its rivals; field meanings in the design's section on findings.json.

    readings : IntArray   indices of the readings it rests on
    impact : IntArray     indices of the readings whose place inside or outside their limits would change
    impact_open : IntArray  of those that would lie within the guard band of a limit: on which side is not sure
    """

    kind: str
    subject: str | tuple[str, ...]
    subject_type: str
    estimate: float | None
    unit: str
    interval95: tuple[float, float] | None
    log_likelihood_gain: float
    family_wise_p: float
    readings: IntArray
    text: str
    id: str = ""
    since: datetime | None = None
    until: datetime | None = None
    since_interval95: tuple[datetime, datetime] | None = None
    would_explain: Mapping[str, Any] | None = None
    also: tuple[str, ...] = ()
    rivals: tuple[Finding, ...] = ()
    next_check: str = ""
    impact: IntArray = field(default_factory=lambda: np.zeros(0, np.intp))
    impact_open: IntArray = field(default_factory=lambda: np.zeros(0, np.intp))
    shift: FloatArray = field(default_factory=lambda: np.zeros(0))
    """Part of the residual at `readings` that the finding explains [pH], for pictures and `explained` status."""


@dataclass(frozen=True)
class Silence:
    """What the record could not show: an untestable kind, or the smallest fault it would have shown."""

    kind: str
    subject: str
    subject_type: str
    reason: str = ""
    size: float | None = None
    unit: str = ""
    power: float | None = None


@dataclass(frozen=True)
class Hazard:
    """Hazard words recorded for a substance in the record; words is never empty."""

    kind: str
    subject: str
    subject_type: str
    substance: str
    words: str
    gas_with_acid: str


@dataclass(frozen=True)
class Constant:
    """One ionization constant met in the record, as the library holds it (25 °C, I = 0), for the report.

    pka [-], u : standard uncertainty [-], enthalpy [kJ/mol] and heat_capacity [J/K/mol] of ionization, NaN when unknown
    """

    acid: str
    step: int
    pka: float
    u: float
    enthalpy: float
    heat_capacity: float
    source: str


@dataclass(frozen=True)
class Spreads:
    """Standard deviations of the clean record as the auditor judged them [pH unless said].

    noise : FloatArray (n,)   reading noise of each reading
    by_name : name -> (value, unit, "estimated" | "stated" | "default", reason)
    """

    noise: FloatArray
    by_name: Mapping[str, tuple[float, str, str, str]]


@dataclass(frozen=True)
class Audit:
    """A whole audit: the record, what was predicted, what is supported, what could not be tested.

    All arrays are (n,), in the order of records.readings.
    residual : observed - predicted [pH]; u_residual : standard deviation of a residual in a clean record; z : ratio
    status : as_predicted, stands_out, explained, adjusted, outside_model, outside_electrode_range, unbuffered, void,
        not_solved
    explained_by : TextArray, ids of findings joined by a space
    evidence : True where the reading took part in the model
    constants : the ionization constants met, with their sources
    before : an earlier report that this audit is compared with
    """

    records: BatchRecords
    prediction: Prediction
    settings: Settings
    residual: FloatArray
    u_residual: FloatArray
    z: FloatArray
    status: TextArray
    explained_by: TextArray
    evidence: BoolArray
    findings: tuple[Finding, ...]
    not_testable: tuple[Silence, ...]
    smallest_detectable: tuple[Silence, ...]
    hazards: tuple[Hazard, ...]
    spreads: Spreads
    constants: tuple[Constant, ...] = ()
    before: Before | None = None

    @property
    def rows(self) -> dict[str, int]:
        """Rows read, used and set aside; read = used + set aside."""
        return {
            "read": self.records.rows_read,
            "used": len(self.records.readings),
            "set_aside": len(self.records.set_aside),
        }

    def residual_columns(self) -> dict[str, FloatArray | TextArray | TimeArray | IntArray]:
        """The columns of residuals.csv, in its order, as arrays (n,)."""
        readings, prediction = self.records.readings, self.prediction
        sheets = self.records.sheets
        source = readings.source.tolist()
        with np.errstate(divide="ignore", invalid="ignore"):
            titrant = self.residual / prediction.d_titrant
        return {
            "source": np.array([sheets[i].file for i in source], object),
            "sheet": np.array([sheets[i].sheet for i in source], object),
            "row": readings.row,
            "batch": np.where(readings["batch"] == "", readings["known"], readings["batch"]),
            "read_at": readings["read_at"],
            "meter": readings["meter"],
            "probe": readings["probe"],
            "stage": readings["stage"],
            "temperature_C": prediction.temperature_c,
            "pH_observed": readings["ph"],
            "pH_predicted": prediction.ph,
            "u_predicted": prediction.u,
            "u_residual": self.u_residual,
            "residual": self.residual,
            "z": self.z,
            "ionic_strength": prediction.ionic_strength,
            "buffer_capacity": prediction.buffer_capacity,
            "titrant_equivalent": titrant,
            "low_limit": readings["low_limit"],
            "high_limit": readings["high_limit"],
            "pH_calculated": readings["ph_calculated"],
            "standing": readings["standing"],
            "status": self.status,
            "explained_by": self.explained_by,
        }

    @property
    def residuals(self) -> pd.DataFrame:
        """residuals.csv as a pandas frame, one row a used reading, in file order."""
        import pandas as pd

        return pd.DataFrame(self.residual_columns())

    @property
    def findings_table(self) -> pd.DataFrame:
        """The findings as a pandas frame, most supported first."""
        import pandas as pd

        names = ("id", "kind", "subject", "subject_type", "estimate", "unit", "interval95", "since", "text")
        return pd.DataFrame([{name: getattr(f, name) for name in names} for f in self.findings], columns=list(names))
