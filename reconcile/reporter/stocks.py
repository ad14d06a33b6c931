"""Every stock of the record with its hazard words: one list for page, workbook, terminal and JSON."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from reconcile.records.results import Audit
from reconcile.reporter.cautions import NO_HAZARD_WORD, gas_words
from reconcile.reporter.plain import plain


@dataclass(frozen=True)
class Stock:
    """One stock lot, or a substance that was used without a lot (lot "").

    index : in records.lots; -1 for a substance without lot
    words : hazard words with the gas given off with acid; "" when none is recorded
    """

    lot: str
    substance: str
    index: int
    words: str
    gas: str

    @property
    def hazard(self) -> str:
        """What is said beside the stock."""
        return "; ".join(filter(None, [self.words, gas_words(self.gas)])) or NO_HAZARD_WORD


def stocks(audit: Audit) -> list[Stock]:
    """Lots in order of name, then substances used without a lot."""
    records = audit.records
    by_lot = {(h.subject, h.substance): h for h in audit.hazards}
    by_substance = {h.substance: h for h in audit.hazards}
    found: list[Stock] = []

    def add(lot: str, form_index: int, index: int) -> None:
        form = records.forms[form_index]
        hazard = by_lot.get((lot, form.name)) or by_substance.get(form.name)
        words, gas = (hazard.words, hazard.gas_with_acid) if hazard else (form.hazard, form.gas_with_acid)
        words = "" if words == NO_HAZARD_WORD else words
        found.append(Stock(plain(lot), plain(form.name), index, plain(words), plain(gas)))

    for index, (lot, form) in enumerate(zip(records.lots.name.tolist(), records.lots.form.tolist(), strict=True)):
        add(str(lot), int(form), index)
    found.sort(key=lambda s: (s.lot, s.substance))
    without = np.unique(records.solutions.form[records.solutions.lot < 0])
    for form in sorted(without.tolist(), key=lambda f: records.forms[f].name):
        add("", int(form), -1)
    return found
