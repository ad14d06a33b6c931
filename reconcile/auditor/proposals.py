"""What a fault kind hands to the search: columns of effect, who they concern, and how likely they are beforehand."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field, replace
from datetime import datetime
from typing import Any, Protocol, TypeVar

import numpy as np
from scipy import sparse

from reconcile.auditor import laws
from reconcile.auditor.components import Model
from reconcile.auditor.layout import Layout
from reconcile.auditor.long_model import LongModel
from reconcile.auditor.retrial import Retrial, Supposed
from reconcile.records.arrays import BoolArray, FloatArray, IntArray
from reconcile.records.settings import Settings

CLASSES = ("meter", "lot", "batch", "reading", "chemistry")
"""Classes between which the alarm rate is split equally."""
ROOM_SHARE = 0.75
"""Least correlation between a subject's fault and the common shape it is first looked at with, on a long record."""
TOP_SHARE = 0.25
"""Share of the largest score under which a subject of a long record waits until the largest is explained."""
T = TypeVar("T")


@dataclass(frozen=True)
class Context:
    """Everything a fault kind may look at: the evidence, the settings, the present model and the retrial of recipes."""

    layout: Layout
    settings: Settings
    model: Model
    retrial: Retrial

    def screen(self, x: sparse.csc_array, steady: bool = False, own: IntArray | None = None) -> FloatArray:
        """Score z of linear columns under the present model; 0 where a column says nothing.

        steady : x is the same object whenever it is screened; own : column of the design that each may be, or -1
        """
        score = np.asarray(x.T @ self.model.pr).ravel()
        information = self.model.information(x, score, own, steady)
        return self._standardized(score, information)

    @staticmethod
    def _standardized(score: FloatArray, information: FloatArray) -> FloatArray:
        return np.where(information > 1e-9, score / np.sqrt(np.maximum(information, 1e-9)), 0.0)

    def promising(
        self, x: sparse.csc_array, least: float, steady: bool = False, own: IntArray | None = None
    ) -> IntArray:
        """Subjects, a column each, whose fault is looked at closely: those with a score over `least`.

        On a long record many subjects pass any fixed score by chance, and very many more while a large fault is not yet
        explained. There the score must come near what a finding about one of so many needs, and near the largest; the
        others are looked at again once the largest is explained.
        """
        if not isinstance(self.model, LongModel):
            return np.flatnonzero(np.abs(self.screen(x, steady, own)) > least)
        slope = np.asarray(x.T @ self.model.pr).ravel()
        bound = self.model.bound(x, own, steady)
        rate = float(self.settings["audit.alarm_rate"]) / len(CLASSES) / max(x.shape[1], 1)
        least = max(least, ROOM_SHARE * float(laws.norm_isf(rate / 2.0)))
        score = self._standardized(slope, self.model.informed(x, slope, bound, np.inf, np.inf, steady))
        least = max(least, TOP_SHARE * float(np.abs(score).max(initial=0.0)))
        score = self._standardized(slope, self.model.informed(x, slope, bound, ROOM_SHARE * least, least, steady))
        return np.flatnonzero(np.abs(score) > least)

    def kept(self, key: object, make: Callable[[], T]) -> T:
        """What was made once for this record under a key."""
        if key not in self.retrial.kept:
            self.retrial.kept[key] = make()
        found: T = self.retrial.kept[key]
        return found


@dataclass(frozen=True)
class Told:
    """One candidate in words and numbers, once its amplitude is known.

    estimate, unit : as in findings.json; scale : estimate = scale(amplitude), for both ends of an interval too
    """

    estimate: float | None
    unit: str
    would_explain: Mapping[str, Any] | None
    since: datetime | None = None
    until: datetime | None = None
    also: tuple[str, ...] = ()
    detail: str = ""
    scale: Callable[[float], float] | None = None


@dataclass(frozen=True)
class Site:
    """A reading that could be taken: on what kind of solution, at which pH and temperature [°C]."""

    ph: float
    temperature: float
    family: str


@dataclass(frozen=True)
class Proposal:
    """Candidates of one kind, k of them.

    x : sparse (n, k)             effect on the residuals at amplitude 1
    subject : k names             (batch, meter, row) for one reading
    subject_type : str
    block : k names               candidates of one block share subjects: one meter's, one lot's, one batch's
    prior_sd : FloatArray (k,)    how large such faults are beforehand, in amplitudes
    log_prior : FloatArray (k,)   log prior odds among the candidates of the kind and subject
    point : BoolArray (k,)        True: the amplitude is exactly 1 (another substance, a doubled amount)
    own : k tuples                columns of the design that hold the subject's own prior for this very effect
    tell : (index, amplitude) -> Told
    """

    kind: str
    alarm_class: str
    subject_type: str
    x: sparse.csc_array
    subject: Sequence[str | tuple[str, ...]]
    block: Sequence[str]
    prior_sd: FloatArray
    log_prior: FloatArray
    point: BoolArray
    tell: Callable[[int, float], Told]
    own: Sequence[tuple[int, ...]] = ()
    same: Sequence[object] = field(default_factory=tuple)
    """What tells apart candidates of one kind and subject in a list of rivals (a substance); () when nothing does."""
    at: Callable[[int, Site], float] | None = None
    """Effect at amplitude 1 on a further reading of the subject meter; None for kinds that are no meter's."""
    supposed: Callable[[int], Supposed | None] | None = None
    """The truth a candidate supposes of recipes, so that variances can be recomputed under it."""
    df: IntArray | None = None
    """Degrees of freedom of a candidate drawn from the readings themselves; None: one each."""
    blocks: int = 0
    """Blocks looked at, where only those that come near significance are handed in (on a long record)."""
    steady: bool = False
    """True where the same proposal serves whatever the model is."""

    def __len__(self) -> int:
        return len(self.subject)


class FaultKind(Protocol):
    """One kind of fault: a module-level object in its own small file under faults/.

    Two more may stand there. `steady = True`: its candidates depend on the record alone, not on the present model, so
    that they are made once. `refine(context, proposal)`: on a long record, further proposals with more candidates of
    the subjects that come near significance.
    """

    name: str
    alarm_class: str

    def propose(self, context: Context) -> Proposal | None:
        """Candidates of this kind for the record, or None when it cannot be tested."""


def stack(columns: Sequence[tuple[IntArray, FloatArray]], n: int) -> sparse.csc_array:
    """Columns given as (rows, values) side by side."""
    if not columns:
        return sparse.csc_array((n, 0))
    sizes = [len(rows) for rows, _ in columns]
    return sparse.csc_array(
        (
            np.concatenate([values for _, values in columns]),
            np.concatenate([rows for rows, _ in columns]),
            np.r_[0, np.cumsum(sizes)],
        ),
        shape=(n, len(columns)),
    )


def linear(
    kind: str,
    alarm_class: str,
    subject_type: str,
    x: sparse.csc_array,
    subject: Sequence[str | tuple[str, ...]],
    tell: Callable[[int, float], Told],
    prior_sd: float,
    *,
    block: Sequence[str] | None = None,
    log_prior: FloatArray | None = None,
    own: Sequence[tuple[int, ...]] = (),
    at: Callable[[int, Site], float] | None = None,
    blocks: int = 0,
    supposed: Callable[[int], Supposed | None] | None = None,
) -> Proposal | None:
    """A proposal whose candidates all have a free amplitude; None when there is no candidate and none was looked at."""
    k = len(subject)
    if not k and not blocks:
        return None
    return Proposal(
        kind,
        alarm_class,
        subject_type,
        x,
        subject,
        [str(s) for s in subject] if block is None else block,
        np.full(k, prior_sd),
        np.zeros(k) if log_prior is None else log_prior,
        np.zeros(k, bool),
        tell,
        own,
        at=at,
        blocks=blocks,
        supposed=supposed,
    )


def steadied(proposal: Proposal | None) -> Proposal | None:
    """The same proposal, to be used again whatever the model is."""
    return None if proposal is None else replace(proposal, steady=True)
