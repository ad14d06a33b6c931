"""Problems with the input as values: one table of codes holds the wording, the effect and the advice."""

from __future__ import annotations

import csv
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from enum import Enum
from pathlib import Path

from reconcile.records.places import Place


class Effect(Enum):
    """What a problem does to the import."""

    STOPS = "stops the import"
    LEAVES_OUT = "leaves the row out"
    NOTED = "noted"


@dataclass(frozen=True)
class Kind:
    """One code: its effect, what is said (with {read} and any words of the problem), what was expected, what to do."""

    effect: Effect
    says: str
    expected: str
    advice: str


_ORIGINAL = "Compare with the original entry and correct it under site procedure; until then this reading is set aside."


def _problems() -> dict[str, Kind]:
    """The table of codes (problems.csv): a new code is a new row there."""
    with (Path(__file__).parent / "problems.csv").open(encoding="utf-8", newline="") as file:
        return {
            r["code"]: Kind(Effect(r["effect"]), r["says"], r["expected"], r["advice"].replace("{original}", _ORIGINAL))
            for r in csv.DictReader(file)
        }


PROBLEMS: Mapping[str, Kind] = _problems()


@dataclass(frozen=True)
class Problem:
    """One problem: its code, the place, what was read there, and the words its template needs."""

    code: str
    place: Place
    read: str = ""
    words: tuple[tuple[str, str], ...] = ()

    @property
    def kind(self) -> Kind:
        return PROBLEMS[self.code]

    def _fill(self, template: str) -> str:
        values = dict(self.words)
        values.setdefault("read", shown(self.read) if self.read else "nothing")
        values.setdefault("bare", self.read)
        for _ in range(2):
            if "{" not in template:
                break
            for key, value in values.items():
                template = template.replace("{" + key + "}", value)
        return template

    @property
    def reason(self) -> str:
        """What is wrong, and what was expected."""
        says = self._fill(self.kind.says)
        ended = says if says.endswith("?") else f"{says}."
        return f"{ended} Expected {self._fill(self.kind.expected)}." if self.kind.expected else ended

    @property
    def advice(self) -> str:
        return self._fill(self.kind.advice)

    def message(self) -> str:
        """Where, what was read, what was expected, what to do."""
        where = self.place.words()
        return " ".join(part for part in (f"{where}: {self.reason}" if where else self.reason, self.advice) if part)


def shown(text: str, most: int = 60) -> str:
    """A cell's text for a message: quoted, hidden characters made visible, cut when long."""
    visible = text if text.isprintable() else "".join(c if c.isprintable() else f"\\u{ord(c):04x}" for c in text)
    return f'"{visible}"' if len(visible) <= most else f'"{visible[:most]}…"'


class InputProblems(Exception):
    """The input is refused: every problem found that stops the import, in sheet order."""

    def __init__(self, problems: Sequence[Problem]) -> None:
        self.problems = tuple(problems)
        super().__init__("; ".join(p.message() for p in self.problems))
