"""Results of a fit of ionization constants: frozen, without behaviour beyond look-ups."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np

from reconcile.records.arrays import AnyArray, FloatArray, IntArray, TextArray
from reconcile.records.book import BatchRecords
from reconcile.records.results import Constant, Hazard
from reconcile.records.settings import Settings

if TYPE_CHECKING:
    import pandas as pd


@dataclass(frozen=True)
class PkaQuestion:
    """What is asked of the readings.

    acid : name of a substance; of one that the library does not hold the rest says what it is
    steps : number of ionization steps, 1 to 3; None chooses it by AICc
    charge : of the fully protonated form; protons_removed : from it, in the substance as weighed
    counter_ion : "name:number per formula unit", "" for none
    molar_mass : of the substance as weighed [g/mol]; None where no amount is by mass
    free : what is sought beside the constants: "strength", "offset"
    noise : standard deviation of a reading [pH]; None estimates it
    """

    acid: str
    steps: int | None = None
    charge: int | None = None
    protons_removed: float | None = None
    counter_ion: str = ""
    molar_mass: float | None = None
    free: tuple[str, ...] = ()
    noise: float | None = None


@dataclass(frozen=True)
class Share:
    """One source of uncertainty of a constant and its share as a standard uncertainty [-]."""

    source: str
    u: float


@dataclass(frozen=True)
class PkaStep:
    """One ionization step.

    standing : "found" (identifiable), "not_identifiable", or "held" (at the library's value; not told by the readings)
    pka, u : thermodynamic (I = 0), at temperature_c, and its full standard uncertainty; None unless found
    interval95 : profile interval with the noise and what was set free; None unless found
    bounds : ends of the profile interval whatever the standing; None where it is open
    pka_apparent : mixed constant (activity of hydrogen ion, molality of the acid's forms) at ionic_strength [mol/kg]
    pka_25c, u_25c : at 25 °C, None without an enthalpy; dh_kj_mol, u_dh : enthalpy of ionization [kJ/mol]
    dh_origin : "fitted", "library" or ""
    budget : shares of u, the largest first
    correlation : with "strength" and "offset", as if each were set free [-]; absent where it is not seen
    library : the library's constant at temperature_c with its u, None for an acid that it does not hold
    with_all : pKa and u of the fit with every reading, where some were rejected
    relation : what is known of a constant that is not identifiable, in words
    """

    step: int
    standing: str
    pka: float | None
    u: float | None
    interval95: tuple[float, float] | None
    bounds: tuple[float | None, float | None]
    pka_apparent: float | None
    ionic_strength: float | None
    temperature_c: float
    pka_25c: float | None = None
    u_25c: float | None = None
    dh_kj_mol: float | None = None
    u_dh: float | None = None
    dh_origin: str = ""
    budget: tuple[Share, ...] = ()
    correlation: Mapping[str, float] = field(default_factory=dict)
    library: tuple[float, float] | None = None
    with_all: tuple[float, float] | None = None
    relation: str = ""


@dataclass(frozen=True)
class Nuisance:
    """Strength factor or meter offset.

    sought : whether it was set free; identifiable : whether these readings would tell it
    value, u : estimate, None unless sought and identifiable
    """

    name: str
    sought: bool
    identifiable: bool
    value: float | None = None
    u: float | None = None


@dataclass(frozen=True)
class PkaCandidate:
    """A library acid that might be the studied one, with its own constants.

    log_likelihood_ratio : against the fitted constants; never above 0 but for what its own uncertainty allows
    explains : whether the readings are consistent with it at the 1 % level
    rms : root mean square residual with the library's constants [pH]; pka : its constants at temperature
    """

    acid: str
    log_likelihood_ratio: float
    explains: bool
    rms: float
    pka: tuple[float, ...]


@dataclass(frozen=True)
class Gap:
    """A range of neutralisation of one step without readings, and what one in it would do to the 95 % interval.

    low, high : percent of the step neutralised; before, after : width of the interval; before is None when open
    """

    step: int
    low: float
    high: float
    before: float | None
    after: float


@dataclass(frozen=True)
class SeriesFit:
    """One titration series (or the solutions made singly) fitted alone: constants and u, None where not seen."""

    series: str
    readings: int
    pka: tuple[float | None, ...]
    u: tuple[float | None, ...]


@dataclass(frozen=True)
class Curve:
    """A line of a picture: label, x and y (m,)."""

    label: str
    x: FloatArray
    y: FloatArray


@dataclass(frozen=True)
class PkaFit:
    """A fit of the constants of one acid.

    All arrays are (n,), one element a reading of a solution that holds the acid, in file order.
    index : reading of records.readings; status : "used", "rejected", "void", "adjusted", "outside_electrode_range",
        "outside_model", "not_solved"
    observed, fitted, residual [pH]; u_reading : standard deviation of the reading about the fit [pH]
    leverage : 0 to 1, NaN where the reading took no part; studentised : externally studentised residual
    temperature [°C], ionic_strength [mol/kg]; neutralised : protons lost over those that can be lost [-]
    base : mol of strong base per mol of the acid as weighed (negative: strong acid); concentration of the acid [mol/kg]
    acid : name in the library, or as asked; formula_words : what was weighed, in words
    steps_chosen : steps -> AICc of each number tried, empty where the number was given or known
    noise, noise_origin : standard deviation of a reading [pH] and "estimated", "floor", "given" or "assumed"
    values : what was found or is known, a sentence or more each; cautions : what a reader must know before using them;
        flags : short names of what was flagged; gap_words, ranking : the gaps and the candidates in words
    gaps : empty also where a hazard word keeps them unsaid
    """

    records: BatchRecords
    settings: Settings
    question: PkaQuestion
    acid: str
    in_library: bool
    formula_words: str
    steps: tuple[PkaStep, ...]
    strength: Nuisance
    offset: Nuisance
    steps_chosen: Mapping[int, float]
    noise: float
    noise_origin: str
    freedom: float
    index: IntArray
    status: TextArray
    observed: FloatArray
    fitted: FloatArray
    residual: FloatArray
    u_reading: FloatArray
    leverage: FloatArray
    studentised: FloatArray
    temperature: FloatArray
    ionic_strength: FloatArray
    neutralised: FloatArray
    base: FloatArray
    concentration: FloatArray
    candidates: tuple[PkaCandidate, ...]
    gaps: tuple[Gap, ...]
    series: tuple[SeriesFit, ...]
    values: tuple[str, ...]
    cautions: tuple[str, ...]
    gap_words: tuple[str, ...]
    ranking: tuple[str, ...]
    flags: tuple[str, ...]
    hazards: tuple[Hazard, ...]
    constants: tuple[Constant, ...]
    curves: tuple[Curve, ...] = ()
    profiles: tuple[Curve, ...] = ()
    species: tuple[Curve, ...] = ()
    reach95: float = 0.0
    """Rise of the weighted sum of squares at the ends of a 95 % interval."""

    @property
    def rows(self) -> dict[str, int]:
        """Rows read, used and set aside of the whole record; read = used + set aside."""
        return {
            "read": self.records.rows_read,
            "used": len(self.records.readings),
            "set_aside": len(self.records.set_aside),
        }

    @property
    def conclusion(self) -> str:
        """All of it in words."""
        return " ".join([*self.values, *self.cautions, *self.gap_words, *self.ranking])

    @property
    def identifiable(self) -> dict[str, bool]:
        """Whether these readings tell the constants sought (all of them), the strength and the meter's offset."""
        sought = [step.standing == "found" for step in self.steps if step.standing != "held"]
        return {
            "pKa": bool(sought) and all(sought),
            "strength": self.strength.identifiable,
            "offset": self.offset.identifiable,
        }

    @property
    def readings_used(self) -> int:
        """Readings that the result rests on."""
        return int(np.count_nonzero(self.status == "used"))

    @property
    def rejected(self) -> IntArray:
        """Rows of the arrays above that were rejected."""
        return np.flatnonzero(self.status == "rejected")

    @property
    def none_of_these(self) -> bool:
        """Whether no acid of the library explains the readings with its own constants."""
        return not any(candidate.explains for candidate in self.candidates)

    def reading_columns(self) -> dict[str, AnyArray]:
        """The columns of the table of readings, in its order, as arrays (n,)."""
        readings, sheets = self.records.readings, self.records.sheets
        source = readings.source[self.index].tolist()
        return {
            "source": np.array([sheets[i].file for i in source], object),
            "sheet": np.array([sheets[i].sheet for i in source], object),
            "row": readings.row[self.index],
            "batch": readings["batch"][self.index],
            "series": readings["series"][self.index],
            "titrant_added": readings["titrant_added"][self.index],
            "meter": readings["meter"][self.index],
            "temperature_C": self.temperature,
            "concentration": self.concentration,
            "base_per_acid": self.base,
            "neutralised": self.neutralised,
            "ionic_strength": self.ionic_strength,
            "pH_observed": self.observed,
            "pH_fitted": self.fitted,
            "residual": self.residual,
            "u_reading": self.u_reading,
            "studentised": self.studentised,
            "leverage": self.leverage,
            "status": self.status,
        }

    @property
    def readings(self) -> pd.DataFrame:
        """The readings of solutions that hold the acid, with fit and residual, as a pandas frame."""
        import pandas as pd

        return pd.DataFrame(self.reading_columns())

    @property
    def candidates_table(self) -> pd.DataFrame:
        """The candidates as a pandas frame, best first."""
        import pandas as pd

        names = ("acid", "log_likelihood_ratio", "explains", "rms", "pka")
        return pd.DataFrame([{n: getattr(c, n) for n in names} for c in self.candidates], columns=list(names))
