"""Did the findings name what was planted? One assignment of findings to planted faults, and the strays left over."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from reconcile.records.results import Finding
from reconcile.records.substances import Form, catalogue
from tests.simulated import chemistry_of_truth as chemistry
from tests.simulated.planted import Planted

SAME_PKA = 0.03
"""Acids this close in every pKa that a pH reading can show count as one: no reading tells them apart."""
BEST_RIVALS = 3
SAME_MEANING: Mapping[str, tuple[str, ...]] = {
    "meter_offset": ("meter_offset",),
    "meter_span": ("meter_span",),
    "meter_drift": ("meter_drift",),
    "meter_step": ("meter_step",),
    "meter_temperature": ("meter_temperature",),
    "meter_stuck": ("meter_stuck",),
    "probe_matrix": ("probe_matrix",),
    "calibration_buffer": ("calibration_buffer",),
    "reading_slip": ("reading_slip",),
    "lot_strength": ("lot_strength",),
    "lot_used_once": ("lot_strength",),
    "lot_identity": ("lot_identity",),
    "lot_hydrate": ("lot_identity", "lot_strength"),
    "batch_preparation": ("batch_preparation", "recipe_slip"),
    "recipe_hydrate": ("recipe_slip", "batch_preparation"),
    "recipe_slip": ("recipe_slip", "batch_preparation"),
    "acid_constant": ("acid_constant",),
    "carbon_dioxide": ("carbon_dioxide",),
    "record_value": ("record_value",),
}
"""By planted fault: the finding kinds that say the same of the same subject, the planted one among them.

lot_hydrate: a hydrate in a whole lot changes nothing but its strength, by a factor that the finding must hold (below).
batch_preparation, recipe_*: one component of one batch out by a factor is one state of affairs under either name.
"""


@dataclass(frozen=True)
class Outcome:
    """What became of one planted fault: "named", "rival" (among the best three) or "missed"; by which finding."""

    planted: Planted
    outcome: str
    finding: Finding | None


@dataclass(frozen=True)
class Matched:
    """One outcome a planted fault, in their order, and the findings that concern none of them."""

    outcomes: tuple[Outcome, ...]
    stray: tuple[Finding, ...]


def _visible(acid: str) -> np.ndarray:
    pka = chemistry.acids()[acid].pka
    return np.asarray(pka[(pka > 1.5) & (pka < 12.5)])


def acts_alike(one: Form, other: Form) -> bool:
    """The same counter-ions an acid unit, and acids within SAME_PKA in every visible pKa, of like charge."""
    if one.acts_as == other.acts_as:
        return True
    if not one.acid or not other.acid or one.acts_as[1] != other.acts_as[1]:
        return False
    if chemistry.acids()[one.acid].charge != chemistry.acids()[other.acid].charge:
        return False
    a, b = _visible(one.acid), _visible(other.acid)
    return len(a) == len(b) and bool(np.all(np.abs(a - b) <= SAME_PKA))


def _same_substance(planted: Planted, finding: Finding) -> bool:
    true = catalogue().by_name[str(planted.detail["substance"])]
    named = [str((finding.would_explain or {}).get("substance", "")), *finding.also]
    forms = [found for name in named if (found := catalogue().look_up(name).form) is not None]
    return any(acts_alike(true, form) for form in forms)


def _same_subject(planted: Planted, finding: Finding) -> bool:
    if planted.subject_type == "acid":
        step = planted.detail["step"]
        return finding.subject in (planted.subject, f"{planted.subject}, step {step}", (planted.subject, str(step)))
    if isinstance(planted.subject, tuple):
        return not isinstance(finding.subject, str) and [str(s) for s in finding.subject] == list(planted.subject)
    return finding.subject == planted.subject


def says(finding: Finding, planted: Planted) -> bool:
    """Whether a finding (or a rival) is the planted fault: kind, subject, and the substance where the kind has one."""
    if finding.kind not in SAME_MEANING[planted.fault] or not _same_subject(planted, finding):
        return False
    if finding.kind == "lot_identity":
        return _same_substance(planted, finding)
    if planted.fault == "lot_hydrate":
        low, high = finding.interval95 or (np.nan, np.nan)
        return bool(low <= planted.detail["factor"] <= high)
    return True


def match(findings: Sequence[Finding], truth: Sequence[Planted]) -> Matched:
    """Assign findings to planted faults, names before rivals, each finding once; what is left over is stray.

    A finding whose subject is right and kind wrong, with the truth not among its best rivals, is stray.
    """
    free = dict(enumerate(findings))
    met: dict[int, Outcome] = {}
    for outcome in ("named", "rival"):
        for i, planted in enumerate(truth):
            if i in met:
                continue
            for j, finding in free.items():
                said = [finding] if outcome == "named" else list(finding.rivals[:BEST_RIVALS])
                if any(says(one, planted) for one in said):
                    met[i] = Outcome(planted, outcome, finding)
                    del free[j]
                    break
    outcomes = tuple(met.get(i, Outcome(planted, "missed", None)) for i, planted in enumerate(truth))
    return Matched(outcomes, tuple(free.values()))
