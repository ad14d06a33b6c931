"""What the library holds on a word: forms, with the ionization constants of the acids that they bring."""

from __future__ import annotations

from dataclasses import dataclass

from reconcile.chemistry.acids import Ionization, acid_table
from reconcile.records.own_substances import OwnSubstances
from reconcile.records.results import Constant, Prediction
from reconcile.records.substances import Form, catalogue, name_key


@dataclass(frozen=True)
class LibraryEntry:
    """One form of the library, with the ionization constants of every acid it brings."""

    form: Form
    constants: tuple[Ionization, ...]


@dataclass(frozen=True)
class LibraryAnswer:
    """What the library holds on a word.

    entries : the forms found, those of one acid side by side
    several : True when the word itself may mean more than one of them
    kin : names of the other forms of the same acid, where the word means one form
    near : names that resemble a word on which nothing was found
    """

    entries: tuple[LibraryEntry, ...]
    several: bool = False
    kin: tuple[str, ...] = ()
    near: tuple[str, ...] = ()


def substances(word: str = "") -> LibraryAnswer:
    """The library of substances, or what of it a word concerns.

    word : a name, synonym or formula, or a part of a name; "" gives the whole library. The name of an acid brings
        its salts along, after it.
    """
    known, table = catalogue(), acid_table()
    found = known.look_up(word) if word else None
    key = name_key(word)
    kin: list[Form] = []
    if found is None:
        forms = list(known.forms)
    elif found.form:
        own = found.form
        kin = [f for f in known.forms if f is not own and own.acid and f.acid == own.acid]
        forms = [own]
        if name_key(own.acid) == key:
            forms, kin = [own, *kin], []
    elif found.several:
        forms = list(found.several)
    else:
        forms = [f for f in known.forms if any(key in name_key(t) for t in (f.name, f.acid, *f.synonyms))]
    return LibraryAnswer(
        tuple(LibraryEntry(f, tuple(c for acid in f.acids for c in table.of(acid))) for f in forms),
        several=bool(found and found.several),
        kin=tuple(f.name for f in kin),
        near=found.near if found and not forms else (),
    )


def constants_met(prediction: Prediction, own: OwnSubstances | None = None) -> tuple[Constant, ...]:
    """The ionization constants that a prediction met, as the library and a site's own substances hold them."""
    rows = {(row.acid, row.step): row for row in acid_table(own=own).rows}
    return tuple(
        Constant(row.acid, row.step, row.pka, row.u, row.dh_kj_mol, row.dcp_j_k_mol, row.source)
        for row in (rows[name] for name in prediction.constant_names)
    )
