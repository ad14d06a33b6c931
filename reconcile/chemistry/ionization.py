"""One ionization: a row of acids.csv, or a step of a site's own acid."""

from __future__ import annotations

import csv
from dataclasses import dataclass
from pathlib import Path

from reconcile.records.own_checks import OwnStep

WEAK_U = 0.1
"""From this standard uncertainty on a constant is marked weak."""
COLUMNS = (
    "acid",
    "formula",
    "CAS",
    "charge_of_fully_protonated_form",
    "step",
    "pKa_25C_I0",
    "u_pKa",
    "dH_kJ_mol",
    "dCp_J_K_mol",
    "source",
    "verified",
    "note",
)


@dataclass(frozen=True)
class Ionization:
    """One row of acids.csv: one proton lost by one acid. dh_kj_mol and dcp_j_k_mol are NaN where unknown."""

    acid: str
    formula: str
    cas: str
    charge: int
    step: int
    pka: float
    u: float
    dh_kj_mol: float
    dcp_j_k_mol: float
    source: str
    verified: str
    note: str

    @property
    def weak(self) -> bool:
        """True where the value rests on little: a large uncertainty, or one estimated by analogy."""
        return self.u >= WEAK_U or "estimate" in self.source


def _number(text: str) -> float:
    return float(text) if text.strip() else float("nan")


def read_acids(path: Path) -> list[Ionization]:
    """Rows of a table with the columns of acids.csv; raises ValueError for a table that is not one."""
    with path.open(encoding="utf-8", newline="") as file:
        reader = csv.DictReader(file)
        missing = set(COLUMNS) - set(reader.fieldnames or ())
        if missing:
            raise ValueError(f"{path.name}: columns missing: {', '.join(sorted(missing))}")
        return [
            Ionization(
                acid=r["acid"],
                formula=r["formula"],
                cas=r["CAS"],
                charge=int(r["charge_of_fully_protonated_form"]),
                step=int(r["step"]),
                pka=float(r["pKa_25C_I0"]),
                u=float(r["u_pKa"]),
                dh_kj_mol=_number(r["dH_kJ_mol"]),
                dcp_j_k_mol=_number(r["dCp_J_K_mol"]),
                source=r["source"],
                verified=r["verified"],
                note=r["note"],
            )
            for r in reader
        ]


def of_site(step: OwnStep) -> Ionization:
    """A step of a site's own acid as a row."""
    return Ionization(
        step.acid,
        step.formula,
        step.cas,
        step.charge,
        step.step,
        step.pka,
        step.u,
        step.enthalpy,
        step.heat_capacity,
        step.source,
        "seen",
        "substance of the site",
    )
