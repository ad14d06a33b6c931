"""Which solution every reading read, and the contributions of each, as the arrays of BatchRecords."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np

from reconcile.importer.bulk import Plain, compose_plain
from reconcile.importer.compose import Composer, Mixture
from reconcile.importer.known import KnownSolutions
from reconcile.importer.lines import Recipes
from reconcile.importer.open_amounts import unsettled
from reconcile.importer.resolve import WATER_NAMES
from reconcile.importer.series import SeriesList
from reconcile.importer.stages import up_to_stage
from reconcile.records.arrays import AnyArray, IntArray
from reconcile.records.places import Place
from reconcile.records.problems import Problem
from reconcile.records.settings import Settings
from reconcile.records.stages import is_before
from reconcile.records.substances import name_key


@dataclass
class SolutionList:
    """Solutions in order of first use.

    plain_group : group of a solution composed in bulk, -1 for one in `mixtures` or a known solution
    mixtures : solution -> Mixture; known : solution -> certified (pH, u, part of u from the temperature)
    """

    batch: list[str] = field(default_factory=list)
    stage: list[str] = field(default_factory=list)
    plain_group: list[int] = field(default_factory=list)
    mixtures: dict[int, Mixture] = field(default_factory=dict)
    known: dict[int, tuple[float, float, float]] = field(default_factory=dict)

    def new(self, batch: str, stage: str, group: int = -1) -> int:
        self.batch.append(batch)
        self.stage.append(stage)
        self.plain_group.append(group)
        return len(self.batch) - 1


class Assigner:
    """Gives every usable reading its solution: its own amounts, else its batch's recipe, else a known solution."""

    def __init__(
        self, recipes: Recipes, composer: Composer, known: KnownSolutions, series: SeriesList, settings: Settings
    ) -> None:
        self.recipes, self.composer, self.known, self.series = recipes, composer, known, series
        self.room = float(settings["prediction.room_temperature_c"])
        self.u_room = float(settings["uncertainty.room_temperature_k"]) / 3.0**0.5
        self.plain: Plain = compose_plain(composer, len(recipes.batch))
        stepped = np.unique(composer.lines.group[composer.lines.step != ""])
        self.stepped = set(stepped.tolist())
        self.made = SolutionList()
        self._additions: dict[tuple[str, str, float], int | Problem] = {}
        self.blanks: dict[str, int] = {}
        self.lost: dict[int, Problem] = {}
        self.first_group = {b: groups[0] for b, groups in recipes.by_batch.items()}

    def assign(
        self, columns: Mapping[str, AnyArray], own_group: IntArray, usable: AnyArray, places: Mapping[str, AnyArray]
    ) -> tuple[IntArray, dict[int, Problem]]:
        """Solution of every reading (-1: none), and the problems of those that have none.

        places : file, sheet, row and the names of the batch and known columns, of every reading
        """
        solution = np.full(len(own_group), -1, np.intp)
        problems: dict[int, Problem] = {}
        batch, stage = columns["batch"].tolist(), columns["stage"].tolist()
        first = self.first_group
        group = [g if g >= 0 else first.get(b, -1) for g, b in zip(own_group.tolist(), batch, strict=True)]
        names, series = columns["series"].tolist(), self.series.analyte
        seen: dict[tuple[int, str], int | Problem] = {}
        for i in np.flatnonzero(usable).tolist():
            g = group[i]
            if series and names[i] in series:
                found: int | Problem = self._of_series(columns, i, places)
            elif g < 0:
                found = self._without_recipe(columns, i, places)
            else:
                key = (g, stage[i])
                if key not in seen:
                    seen[key] = self._recipe(g, batch[i], stage[i])
                found = seen[key]
            if isinstance(found, Problem):
                problems[i] = found
            else:
                solution[i] = found
        problems.update(self._unsettled(columns, solution))
        return solution, problems

    def _unsettled(self, columns: Mapping[str, AnyArray], solution: IntArray) -> dict[int, Problem]:
        """Readings whose solution holds an amount that no pH settles; they lose it."""
        opens = {s: sorted({p.open for p, *_ in m.parts if p.open >= 0}) for s, m in self.made.mixtures.items()}
        waiting = {s: some for s, some in opens.items() if some}
        if not waiting:
            return {}
        speaks = (solution >= 0) & (columns["standing"] != "void")
        while True:
            read = {self.made.batch[s] for s in solution[speaks & (solution >= 0)].tolist()}
            why = {s: found for s, some in waiting.items() if (found := unsettled(self.composer, some, read))}
            lost = [i for i in np.flatnonzero(solution >= 0).tolist() if int(solution[i]) in why]
            if not lost:
                return self.lost
            self.lost.update({i: why[int(solution[i])] for i in lost})
            solution[lost] = -1

    def _recipe(self, group: int, batch: str, stage: str) -> int | Problem:
        partial = stage != "" and (group in self.stepped or is_before(stage))
        if self.plain.plain[group] and not partial:
            return self.made.new(batch, stage, group)
        lines = self.composer.by_group.get(group, [])
        mixture = self.composer.mixture(up_to_stage(self.composer, lines, stage) if partial else lines)
        if mixture.problem is not None:
            return mixture.problem
        index = self.made.new(batch or self.recipes.batch[group], stage)
        self.made.mixtures[index] = mixture
        return index

    def _of_series(self, columns: Mapping[str, AnyArray], i: int, places: Mapping[str, AnyArray]) -> int | Problem:
        name, added = columns["series"][i], float(columns["titrant_added"][i])
        if np.isnan(added):
            place = Place(places["file"][i], places["sheet"][i], int(places["row"][i]), places["series"][i])
            return Problem("titrant-missing", place, name)
        key = (name, columns["stage"][i], added)
        if key not in self._additions:
            mixture = self.series.mixture(name, added, self.composer)
            if mixture.problem is not None:
                self._additions[key] = mixture.problem
            else:
                index = self.made.new(columns["batch"][i] or name, columns["stage"][i])
                self.made.mixtures[index] = mixture
                self._additions[key] = index
        return self._additions[key]

    def _without_recipe(self, columns: Mapping[str, AnyArray], i: int, places: Mapping[str, AnyArray]) -> int | Problem:
        def place(name: str) -> Place:
            return Place(places["file"][i], places["sheet"][i], int(places["row"][i]), places[name][i])

        name, lot = columns["known"][i], columns["known_lot"][i]
        if not name and not columns["batch"][i]:
            return Problem("series-unknown", place("series"), columns["series"][i])
        if name_key(name or columns["batch"][i]) in WATER_NAMES:
            return self._water(name or columns["batch"][i])
        if not name:
            return Problem("batch-without-recipe", place("batch"), columns["batch"][i])
        reference, own = float(columns["reference_temperature"][i]), float(columns["temperature"][i])
        stated = own if np.isnan(reference) else reference
        temperature = self.room if np.isnan(stated) else stated
        key = (name, lot, temperature, bool(np.isnan(stated)))
        if key not in self.known.solutions:
            value = self.known.at(name, lot, temperature, self.u_room if np.isnan(stated) else 0.0)
            if value is not None:
                index = self.made.new("", "")
                self.made.known[index] = value
                self.known.solutions[key] = index
        if key in self.known.solutions:
            return self.known.solutions[key]
        code = "known-temperature" if self.known.is_listed(name) else "known-not-known"
        return Problem(code, place("known"), name, (("temperature", f"{temperature:g}"),))

    def _water(self, name: str) -> int:
        """A reading of water alone: a solution that holds nothing."""
        if name not in self.blanks:
            self.blanks[name] = self.made.new(name, "")
            self.made.mixtures[self.blanks[name]] = Mixture()
        return self.blanks[name]
