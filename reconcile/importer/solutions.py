"""Which solution every reading read, and the contributions of each, as the arrays of BatchRecords."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from reconcile.importer.compose import Composer, Mixture
from reconcile.importer.known import KnownSolutions
from reconcile.importer.lines import Recipes
from reconcile.importer.resolve import LotList
from reconcile.records.arrays import AnyArray, FloatArray, IntArray, TextArray
from reconcile.records.book import Lots, Solutions
from reconcile.records.columns import heading_key
from reconcile.records.places import Place
from reconcile.records.problems import Problem
from reconcile.records.settings import Settings
from reconcile.records.substances import Form


@dataclass
class Assigned:
    """Solution of every reading (-1: none), and the problem that prevents one."""

    solution: IntArray
    problem: dict[int, Problem]


@dataclass
class SolutionList:
    """Solutions in order of first use."""

    batch: list[str]
    stage: list[str]
    mixtures: list[Mixture]
    known: list[tuple[float, float]]


def assign(
    columns: Mapping[str, AnyArray],
    own_group: IntArray,
    usable: AnyArray,
    recipes: Recipes,
    composer: Composer,
    known: KnownSolutions,
    settings: Settings,
    places: Mapping[str, AnyArray],
) -> tuple[Assigned, SolutionList]:
    """Give every usable reading its solution.

    A row's own amounts go first, then the batch's recipe, then a known solution. `places` holds file, sheet, row and
    column names of the readings, for the problems of those that have none.
    """
    n = len(own_group)
    out = Assigned(np.full(n, -1, np.intp), {})
    made = SolutionList([], [], [], [])
    seen: dict[tuple[object, ...], int | Problem] = {}
    batch, stage, name, lot = (columns[c].tolist() for c in ("batch", "stage", "known", "known_lot"))
    temperature = columns["temperature"].tolist()
    room = settings["prediction.room_temperature_c"]
    for i in np.flatnonzero(usable).tolist():
        group = int(own_group[i])
        if group < 0 and batch[i]:
            group = _group_of(recipes, batch[i])
        t = room if np.isnan(temperature[i]) else temperature[i]
        key = (group, stage[i], 0.0) if group >= 0 else (name[i] or batch[i], lot[i], t if name[i] else -1.0)
        if key not in seen:
            if group >= 0:
                seen[key] = _recipe(made, composer, recipes, group, batch[i], stage[i])
            elif name[i]:
                seen[key] = _known(made, known, name[i], lot[i], t, places, i)
            else:
                seen[key] = Problem("batch-without-recipe", _place(places, i, "batch"), batch[i])
        found = seen[key]
        if isinstance(found, Problem):
            out.problem[i] = _own_place(found, places, i)
        else:
            out.solution[i] = found
    return out, made


def _own_place(problem: Problem, places: Mapping[str, AnyArray], i: int) -> Problem:
    """A problem of the readings sheet itself stands at this reading's own row."""
    if problem.code == "batch-without-recipe":
        return Problem(problem.code, _place(places, i, "batch"), problem.read, problem.words)
    if problem.code in ("known-not-known", "known-temperature"):
        return Problem(problem.code, _place(places, i, "known"), problem.read, problem.words)
    return problem


def _place(places: Mapping[str, AnyArray], i: int, name: str) -> Place:
    return Place(places["file"][i], places["sheet"][i], int(places["row"][i]), places[name][i])


def _group_of(recipes: Recipes, batch: str) -> int:
    groups = recipes.by_batch.get(batch, [])
    return groups[0] if groups else -1


def _recipe(
    made: SolutionList, composer: Composer, recipes: Recipes, group: int, batch: str, stage: str
) -> int | Problem:
    lines = composer.by_group.get(group, [])
    mixture = composer.mixture(_up_to_stage(composer, lines, stage))
    if mixture.problem is not None:
        return mixture.problem
    made.batch.append(batch or recipes.batch[group])
    made.stage.append(stage)
    made.mixtures.append(mixture)
    made.known.append((np.nan, np.nan))
    return len(made.batch) - 1


def _up_to_stage(composer: Composer, lines: list[int], stage: str) -> list[int]:
    """Lines added up to and with the step that a stage names; all of them where no step bears its name."""
    if not stage:
        return lines
    steps = list(dict.fromkeys(heading_key(composer.lines.step[i]) for i in lines))
    wanted = heading_key(stage)
    if wanted not in steps:
        return lines
    upto = set(steps[: steps.index(wanted) + 1]) | {""}
    return [i for i in lines if heading_key(composer.lines.step[i]) in upto]


def _known(
    made: SolutionList,
    known: KnownSolutions,
    name: str,
    lot: str,
    temperature: float,
    places: Mapping[str, AnyArray],
    i: int,
) -> int | Problem:
    value = known.certified(name, lot, temperature)
    if value is None:
        listed = heading_key(name) in known.by_name
        code = "known-temperature" if listed else "known-not-known"
        return Problem(code, _place(places, i, "known"), name, (("temperature", f"{temperature:g}"),))
    made.batch.append("")
    made.stage.append("")
    made.mixtures.append(Mixture())
    made.known.append(value)
    return len(made.batch) - 1


def solutions_of(made: SolutionList, composer: Composer) -> tuple[Solutions, tuple[Form, ...], IntArray]:
    """The arrays of every solution, sorted by solution, the forms they refer to, and the lots that are used."""
    forms: dict[Form, int] = {}
    solution: list[int] = []
    form: list[int] = []
    lot: list[int] = []
    amount: list[float] = []
    u: list[float] = []
    by_mass: list[bool] = []
    line: list[int] = []
    pairs: list[tuple[int, int]] = []
    for s, mixture in enumerate(made.mixtures):
        for part, final, u_final in mixture.parts:
            pairs.extend((len(solution), chained) for chained in part.chain)
            solution.append(s)
            form.append(forms.setdefault(part.form, len(forms)))
            lot.append(part.lot)
            amount.append(final)
            u.append(u_final)
            by_mass.append(part.by_mass)
            line.append(part.line)
    lines = composer.lines
    index = np.array(line, np.intp)
    stated: TextArray = np.empty(len(line), object)
    stated[:] = [composer.stated(i) for i in line]
    known = np.array(made.known, np.float64).reshape(-1, 2)
    chains = np.array(pairs, np.intp).reshape(-1, 2)
    used = np.unique(chains[:, 1])
    new = np.full(len(composer.resolver.lots.forms) + 1, -1, np.intp)  # the last entry keeps -1 at -1
    new[used] = np.arange(len(used))
    result = Solutions(
        batch=_texts(made.batch),
        stage=_texts(made.stage),
        per_kg_water=np.array([m.per_kg_water for m in made.mixtures], bool),
        known_ph=known[:, 0],
        known_u=known[:, 1],
        solution=np.array(solution, np.intp),
        form=np.array(form, np.intp),
        lot=new[np.array(lot, np.intp)],
        amount=np.array(amount, np.float64),
        u_amount=np.array(u, np.float64),
        by_mass=np.array(by_mass, bool),
        recipe_row=lines.table_row[index] if len(index) else index,
        place=tuple(composer.place(i, lines.column[i]) for i in line),
        stated=stated,
        chain_contribution=chains[:, 0],
        chain_lot=new[chains[:, 1]],
    )
    return result, tuple(forms), used


def _texts(texts: list[str]) -> TextArray:
    out = np.empty(len(texts), object)
    out[:] = texts
    return out


def lots_of(
    lots: LotList, used: IntArray, forms: tuple[Form, ...], settings: Settings
) -> tuple[Lots, tuple[Form, ...]]:
    """The used lots as arrays; forms that only a lot's label names are added to the forms."""
    names = lots.names()
    kept = used.tolist()
    index = {f: i for i, f in enumerate(forms)}
    for k in kept:
        index.setdefault(lots.forms[k], len(index))
    default = float(settings["uncertainty.lot_strength_percent"])
    u: FloatArray = np.full(len(kept), default / np.sqrt(3.0) / 100.0)
    strength = np.full(len(kept), np.nan)
    unit = np.full(len(kept), "", object)
    row = np.full(len(kept), -1, np.intp)
    for i, k in enumerate(kept):
        stock = lots.stocks[k]
        if stock is None:
            continue
        row[i] = stock.row
        if not np.isnan(stock.tolerance):
            u[i] = stock.tolerance / np.sqrt(3.0) / 100.0
        if stock.is_solution and stock.unit is not None:
            strength[i], unit[i] = stock.strength, stock.unit.name
    form = np.array([index[lots.forms[k]] for k in kept], np.intp)
    return Lots(_texts([names[k] for k in kept]), form, u, strength, unit, row), tuple(index)
