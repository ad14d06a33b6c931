"""The table of acids: charges, ionization constants, their heats, uncertainties and sources (acids.csv)."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import cache, cached_property
from pathlib import Path

import numpy as np

from reconcile.chemistry.ion_data import interaction_matrix, read_sizes, truesdell_jones
from reconcile.chemistry.ionization import Ionization as Ionization
from reconcile.chemistry.ionization import of_site
from reconcile.chemistry.ionization import read_acids as read_acids
from reconcile.chemistry.pair_table import Pair
from reconcile.chemistry.pair_table import pairs as pairs_chosen
from reconcile.chemistry.pka_law import NEVER, Laws, Terms, laws
from reconcile.chemistry.temperature import (
    U_KNOWN_DCP,
    U_KNOWN_DH,
    U_MISSING_DCP,
    U_MISSING_DH,
    spread_between,
    van_t_hoff,
)
from reconcile.records.arrays import BoolArray, FloatArray, IntArray
from reconcile.records.own_substances import OwnSubstances, own_of_user

FOLDER = Path(__file__).parent


@dataclass(frozen=True)
class AcidTable:
    """Acids as arrays for the engine: a acids, q ionization constants, those of one acid side by side in order.

    names : (a,)
    charge : FloatArray (a,)   charge of the fully protonated form
    steps : IntArray (a,)      number of ionization steps
    first : IntArray (a,)      index of the first constant
    rows : (q,)                the table itself
    pka, u, u_dh, u_dcp : FloatArray (q,)   at 25 °C and I = 0; u of enthalpy and heat capacity as temperature.py has it
    p, q, r : FloatArray (q,)  pKa(T) = p + q/T + r ln T
    size : FloatArray (a + q,) ion size [angstrom] of every protonation state; those of acid i start at first[i] + i
    use_equations : whether published equations give pKa(T) where there is one (pka_law.py)
    pairs : ion pairs and condensed species that may take part (pair_table.py)
    """

    names: tuple[str, ...]
    charge: FloatArray
    steps: IntArray
    first: IntArray
    rows: tuple[Ionization, ...]
    pka: FloatArray
    u: FloatArray
    u_dh: FloatArray
    u_dcp: FloatArray
    p: FloatArray
    q: FloatArray
    r: FloatArray
    size: FloatArray
    use_equations: bool = False
    pairs: tuple[Pair, ...] = ()

    @cached_property
    def index(self) -> Mapping[str, int]:
        return {name: i for i, name in enumerate(self.names)}

    @cached_property
    def laws(self) -> Laws:
        """pKa against temperature of every constant; of those behind `rows`, p, q and r alone."""
        owner = np.repeat(np.arange(len(self.names)), self.steps)
        charge = self.charge[owner] - (np.arange(len(owner)) - self.first[owner])
        return laws(self.p, self.q, self.r, charge, self.constant_names, self.use_equations)

    def pka_at(self, constant: IntArray, temperature_c: FloatArray) -> FloatArray:
        """pKa at I = 0 of some constants (indices), each at its temperature [°C]."""
        return self.laws.value(constant, temperature_c)

    def u_at(self, constant: IntArray, kelvin: FloatArray) -> FloatArray:
        """Standard uncertainty of some constants (indices), each at its temperature [K]; they broadcast."""
        reference = np.clip(kelvin, self.laws.low_k[constant], self.laws.high_k[constant])
        by_dh, by_dcp = spread_between(kelvin, reference)
        u2 = (self.u**2)[constant] + (self.u_dh**2)[constant] * by_dh**2 + (self.u_dcp**2)[constant] * by_dcp**2
        return np.asarray(np.sqrt(u2))

    @cached_property
    def by_step(self) -> tuple[Terms, FloatArray, IntArray]:
        """Terms of pKa(T), the upper ends of the equations, and the index of each constant, one row a step.

        Columns (a + 1) are acids, the last one for no acid; the Terms have them twice, first within, then beyond the
        range of an equation, and an acid's range ends where that of any of its equations does. A step that an acid
        does not have gets an infinite pKa (its constant is then 0) and the index -1.
        """
        width = len(self.names) + 1
        shape = (int(self.steps.max(initial=1)), 2 * width)
        known = self.laws
        parts = {name: np.zeros(shape) for name in ("p", "q", "r", "t", "w")}
        parts["p"][:] = np.inf
        which = np.full((shape[0], width), -1, np.intp)
        edge = np.full(width, NEVER)
        for step in range(shape[0]):
            has = np.flatnonzero(self.steps > step)
            at = self.first[has] + step
            which[step, has] = at
            edge[has] = np.maximum(edge[has], known.edge_c[at])
            for name, values in parts.items():
                values[step, has] = getattr(known.within, name)[at]
                values[step, width + has] = getattr(known.beyond, name)[at]
        return Terms(**parts), edge, which

    @cached_property
    def states(self) -> tuple[tuple[str, int, int], ...]:
        """(acid, protons lost, charge) of every protonation state, in the order of `size`."""
        return tuple(
            (name, lost, int(charge) - lost)
            for name, charge, steps in zip(self.names, self.charge, self.steps, strict=True)
            for lost in range(int(steps) + 1)
        )

    def state_of(self, acid: IntArray, lost: int) -> IntArray:
        """Index of a protonation state of some acids; an acid's last state where it cannot lose as many protons."""
        safe = np.minimum(acid, len(self.names) - 1)
        return np.asarray(self.first[safe] + safe + np.minimum(lost, self.steps[safe]))

    @cached_property
    def sizes_and_linear(self) -> tuple[FloatArray, FloatArray]:
        """Size [angstrom] and linear coefficient over charge squared [kg/mol] of every state (a + q,)."""
        return truesdell_jones(self.states, self.size)

    @cached_property
    def interactions(self) -> FloatArray:
        """Coefficient of specific interaction of every state, then of H+ and OH-, with every strong ion [kg/mol]."""
        return interaction_matrix(self.states)

    @property
    def constant_names(self) -> tuple[tuple[str, int], ...]:
        return tuple((row.acid, row.step) for row in self.rows)

    @property
    def weak(self) -> BoolArray:
        """(q,) True for the constants marked weak."""
        return np.array([row.weak for row in self.rows], bool)

    def of(self, acid: str) -> tuple[Ionization, ...]:
        """The steps of one acid, in order."""
        i = self.index[acid]
        return self.rows[self.first[i] : self.first[i] + self.steps[i]]


def _check(acid: str, rows: list[Ionization]) -> None:
    if [r.step for r in rows] != list(range(1, len(rows) + 1)):
        raise ValueError(f"acids: the steps of {acid} are not 1 to {len(rows)}, in order and side by side")
    if len({r.charge for r in rows}) != 1:
        raise ValueError(f"acids: {acid} has more than one charge of its fully protonated form")
    pka = [r.pka for r in rows]
    if sorted(pka) != pka:
        raise ValueError(f"acids: the pKa of {acid} do not ascend")
    for r in rows:
        if not r.u > 0.0 or not np.isfinite(r.pka):
            raise ValueError(f"acids: {acid}, step {r.step}: pKa and a positive uncertainty are needed")
        if not r.source:
            raise ValueError(f"acids: {acid}, step {r.step} has no source")


def build(
    rows: Iterable[Ionization],
    sizes: Mapping[tuple[str, int], float] | None = None,
    use_equations: bool = False,
    pairs: tuple[Pair, ...] = (),
) -> AcidTable:
    """An AcidTable from rows grouped by acid; raises ValueError for steps, charges or constants that cannot be."""
    grouped: dict[str, list[Ionization]] = {}
    for row in rows:
        grouped.setdefault(row.acid, []).append(row)
    for acid, steps in grouped.items():
        _check(acid, steps)
    flat = tuple(row for steps in grouped.values() for row in steps)
    counts = np.array([len(steps) for steps in grouped.values()], np.intp)
    pka = np.array([r.pka for r in flat], float)
    dh = np.array([r.dh_kj_mol for r in flat], float)
    dcp = np.array([r.dcp_j_k_mol for r in flat], float)
    p, q, r = van_t_hoff(pka, dh, dcp)
    sizes = sizes or {}
    return AcidTable(
        names=tuple(grouped),
        charge=np.array([steps[0].charge for steps in grouped.values()], float),
        steps=counts,
        first=np.concatenate([[0], np.cumsum(counts)[:-1]]).astype(np.intp),
        rows=flat,
        pka=pka,
        u=np.array([row.u for row in flat], float),
        u_dh=np.where(np.isnan(dh), U_MISSING_DH, U_KNOWN_DH),
        u_dcp=np.where(np.isnan(dcp), U_MISSING_DCP, U_KNOWN_DCP),
        p=p,
        q=q,
        r=r,
        size=np.array(
            [
                sizes.get((acid, lost), usual_size(steps[0].charge - lost))
                for acid, steps in grouped.items()
                for lost in range(len(steps) + 1)
            ],
            float,
        ),
        use_equations=use_equations,
        pairs=pairs,
    )


def usual_size(charge: int) -> float:
    """Ion size [angstrom] where none is published: the commonest of Kielland's organic ions of that charge."""
    return {0: 4.5, 1: 4.5, 2: 5.0}.get(abs(charge), 5.0)


@cache
def _package_rows() -> tuple[Ionization, ...]:
    return tuple(read_acids(FOLDER / "acids.csv"))


_tables: dict[tuple[object, ...], AcidTable] = {}


def acid_table(
    use_equations: bool = True, ion_pairs: str | tuple[str, ...] = "complexes", own: OwnSubstances | None = None
) -> AcidTable:
    """The acids that come with the package, a site's own behind.

    use_equations, ion_pairs : as the settings choose
    own : by default what is kept in the user's configuration; raises InputProblems where that is not in order
    """
    own = own_of_user() if own is None else own
    key = use_equations, ion_pairs, own.key
    if key not in _tables:
        rows = [*_package_rows(), *(of_site(step) for step in own.steps)]
        _tables[key] = build(rows, read_sizes(), use_equations, pairs_chosen(ion_pairs))
    return _tables[key]
