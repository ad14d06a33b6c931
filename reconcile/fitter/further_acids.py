"""The table of acids with further acids behind, or with some of its acids only, whatever columns it has."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import fields, is_dataclass, replace
from typing import Any

import numpy as np

from reconcile.chemistry.acids import AcidTable, usual_size
from reconcile.chemistry.pka_law import laws
from reconcile.records.arrays import FloatArray


def with_further(
    base: AcidTable, names: tuple[str, ...], charge: int, columns: dict[str, FloatArray], like: int = -1
) -> AcidTable:
    """The table with more acids of one charge and one number of steps behind those it has.

    Parameters
    ----------
    base : AcidTable
        a acids, q constants.
    names : (m,)
    charge : int
        Of the fully protonated form.
    columns : mapping of str to ndarray (m, s)
        What is known of their constants: pka, p, q, r, u. Every other column is 0 for them.
    like : int
        Acid of the base whose states they share, so that they take its ion sizes and whatever else belongs to a state;
        -1 for usual sizes.

    Returns
    -------
    AcidTable
    """
    m, s = columns["pka"].shape
    a, q = len(base.names), len(base.pka)
    given: dict[str, Any] = {
        "names": (*base.names, *names),
        "charge": np.concatenate([base.charge, np.full(m, float(charge))]),
        "steps": np.concatenate([base.steps, np.full(m, s)]).astype(np.intp),
        "first": np.concatenate([base.first, q + s * np.arange(m)]).astype(np.intp),
    }
    own = np.zeros(0, np.intp)
    if like >= 0 and int(base.steps[like]) == s and float(base.charge[like]) == charge:
        own = int(base.first[like]) + like + np.arange(s + 1)
    sizes = np.array([usual_size(charge - lost) for lost in range(s + 1)], float)
    made = {}
    for field in fields(AcidTable):
        value = getattr(base, field.name)
        if field.name in given:
            made[field.name] = given[field.name]
        elif not isinstance(value, np.ndarray) or value.ndim != 1:
            made[field.name] = value
        elif len(value) == q:
            more = columns.get(field.name, np.zeros((m, s)))
            made[field.name] = np.concatenate([value, more.ravel()])
        elif len(value) == a:
            made[field.name] = np.concatenate([value, np.zeros(m, value.dtype)])
        else:  # of every protonation state
            state = value[own] if len(own) else sizes if field.name == "size" else np.zeros(s + 1)
            made[field.name] = np.concatenate([value, np.tile(state, m)])
    table = AcidTable(**made)
    p, q_, r = (columns.get(name, np.zeros((m, s))).ravel() for name in ("p", "q", "r"))
    further = laws(p, q_, r, np.zeros(m * s), (), use_equations=False)
    vars(table)["laws"] = _joined(base.laws, further)  # what the table would find itself, but for the base only once
    return table


def _joined(first: Any, second: Any) -> Any:
    """Two of the same dataclass with their arrays, and those inside what they hold, one behind the other."""
    parts = {}
    for field in fields(first):
        one, other = getattr(first, field.name), getattr(second, field.name)
        parts[field.name] = _joined(one, other) if is_dataclass(one) else np.concatenate([one, other])
    return replace(first, **parts)


def only(base: AcidTable, names: Iterable[str]) -> AcidTable:
    """The table with these acids only, in its own order: its width is the cost of every call of the engine."""
    wanted = set(names)
    acids = np.array([i for i, name in enumerate(base.names) if name in wanted], np.intp)
    steps = base.steps[acids]
    ends = np.cumsum(steps)
    within = np.arange(ends[-1] if len(ends) else 0) - np.repeat(ends - steps, steps)
    constants = np.repeat(base.first[acids], steps) + within
    states = np.concatenate([base.first[i] + i + np.arange(base.steps[i] + 1) for i in acids.tolist()])
    a, q = len(base.names), len(base.pka)
    made: dict[str, Any] = {}
    for field in fields(AcidTable):
        value = getattr(base, field.name)
        if field.name == "names":
            made[field.name] = tuple(base.names[i] for i in acids.tolist())
        elif field.name == "first":
            made[field.name] = (ends - steps).astype(np.intp)
        elif field.name == "rows":  # an acid behind those of the library has no rows
            made[field.name] = tuple(base.rows[i] for i in constants.tolist() if i < len(base.rows))
        elif not isinstance(value, np.ndarray) or value.ndim != 1:
            made[field.name] = value
        else:
            made[field.name] = value[{q: constants, a: acids}.get(len(value), states)]
    return AcidTable(**made)
