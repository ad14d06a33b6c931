"""Do next checks decide as often as they claim? Each is simulated: the reading is taken in the simulated room.

    python -m tests.bench.check_tables --seeds 60

For every record whose planted fault is one of the two explanations that the named reading tells apart least well, the
reading is drawn in the world behind the record, and the one of the two under which it is likelier is chosen. Printed:
how often that is the planted one, beside the mean of what the checks claim (one less the chance of a wrong choice,
which is stated for those two), by kind and by claim.
"""

from __future__ import annotations

import argparse
import sys
from collections.abc import Sequence
from copy import copy
from itertools import combinations
from multiprocessing import get_context

import numpy as np

from reconcile.auditor.check_plan import Plan
from reconcile.auditor.findings import build
from reconcile.auditor.next_check import plan
from reconcile.records.arrays import FloatArray
from tests.bench.blame_run import search_of
from tests.simulated.matching import says
from tests.simulated.planted import Planted
from tests.simulated.simulator import simulate
from tests.simulated.world import ROOT3, World

SIZES: dict[str, tuple[float, ...]] = {
    "meter_offset": (0.06, 0.08),
    "meter_span": (0.02, 0.03),
    "meter_step": (0.04, 0.06),
    "meter_drift": (0.07, 0.12),
    "meter_temperature": (25.0,),
    "probe_matrix": (0.06, 0.1),
    "lot_strength": (1.08, 1.15),
    "lot_identity": (0.05,),
    "lot_hydrate": (1.1,),
    "acid_constant": (0.06, 0.08),
}
"""Sizes at which rivals are common, by kind."""
DRAWS = 200


def taken(world: World, planted: Planted, chosen: Plan, rng: np.random.Generator) -> FloatArray:
    """What the reading would show in the world of the record, for each of DRAWS draws of its errors (DRAWS,)."""
    room, check = world.room, chosen.check
    later = copy(world)
    meter = next(m for m in range(room.n_meters) if world.meter_name(m) == check.meter)
    stated = check.site.temperature
    later.celsius = np.full(DRAWS, stated)
    known = np.full(DRAWS, np.nan)
    if check.template < 0:
        known[:] = check.site.ph
        later.read_solution = np.full(DRAWS, -1)
        later.celsius_true = later.celsius
    else:
        names = [world.batch_name(i) for i in range(len(world.made))]
        later.read_solution = np.full(DRAWS, names.index(check.batch_of))
        later.celsius_true = stated + rng.normal(0.0, room.temperature_k * room.spread / ROOT3, DRAWS)
    later.known = known
    ph = later.true_ph()
    shown = ph + world.offset[meter] + world.span[meter] * (ph - 7.0)
    if planted.subject == check.meter and planted.size is not None:
        if planted.kind == "meter_step":
            shown = shown + planted.size
        elif planted.kind == "meter_drift":
            shown = shown + planted.detail["total"]
        elif planted.kind == "meter_temperature":
            shown = shown + (ph - 7.0) * ((later.celsius_true + 273.15) / (planted.size + 273.15) - 1.0)
        elif planted.kind == "probe_matrix" and check.template >= 0 and world.kind[later.read_solution[0]] == "Tris":
            shown = shown + planted.size
    noise = room.noise * room.spread * rng.standard_normal(DRAWS)
    return np.asarray(np.round((shown + noise) / room.resolution) * room.resolution)


def hardest(chosen: Plan) -> list[int]:
    """The two explanations that the check tells apart least well."""
    pairs = list(combinations(range(len(chosen.means)), 2))
    apart = [
        abs(chosen.means[a] - chosen.means[b]) / np.sqrt((chosen.spreads[a] ** 2 + chosen.spreads[b] ** 2) / 2.0)
        for a, b in pairs
    ]
    return list(pairs[int(np.argmin(apart))])


def tried(task: tuple[str, float, int]) -> list[tuple[str, int, float, float]]:
    """(kind, explanations, claimed, share of draws that chose the planted one) of each check in one record."""
    kind, size, seed = task
    simulated = simulate(seed, [kind], {kind: size})
    search = search_of(simulated)
    state, layout, reach = search.run(), search.layout, float(simulated.settings["audit.reach"])
    rng = np.random.default_rng([seed, 77])
    found = []
    for j, (finding, candidates) in enumerate(build(search, state, layout, reach)):
        told = [finding, *finding.rivals][: len(candidates)]
        chosen = plan(search, state, j, candidates)
        if chosen is None:
            continue
        right = [says(one, simulated.truth[0]) for one in told[: len(chosen.names)]]
        right += [False] * (len(chosen.names) - len(right))
        pair = hardest(chosen)
        if right[pair[0]] == right[pair[1]]:  # the claim is not about the planted one, or both say the same of it
            continue
        shown = taken(simulated.world, simulated.truth[0], chosen, rng)
        z = (shown[:, None] - chosen.means[pair]) / chosen.spreads[pair]
        best = np.array(pair)[np.argmin(0.5 * z**2 + np.log(chosen.spreads[pair]), axis=1)]
        true = pair[0] if right[pair[0]] else pair[1]
        found.append((kind, len(candidates), 1.0 - chosen.wrong, float(np.mean(best == true))))
    return found


def line(name: str, rows: Sequence[tuple[str, int, float, float]]) -> str:
    """One line of the table."""
    claimed, right = np.array([r[2] for r in rows]), np.array([r[3] for r in rows])
    u = float(np.std(right) / np.sqrt(len(right)))
    return (
        f"{name:22} {len(rows):6d}   claimed {100 * claimed.mean():5.1f} %   right {100 * right.mean():5.1f} %"
        f"   (u {100 * u:.1f})   difference {100 * (right.mean() - claimed.mean()):+5.1f}"
    )


def main(arguments: Sequence[str]) -> None:
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--seeds", type=int, default=60)
    parser.add_argument("--first", type=int, default=0)
    parser.add_argument("--processes", type=int, default=2)
    parser.add_argument("--only", nargs="*", default=list(SIZES), choices=list(SIZES))
    options = parser.parse_args(arguments)
    rows: list[tuple[str, int, float, float]] = []
    for kind in options.only:
        seeds = range(options.first, options.first + options.seeds)
        tasks = [(kind, size, seed) for size in SIZES[kind] for seed in seeds]
        with get_context("fork").Pool(options.processes) as pool:
            found = [row for rows_of_one in pool.map(tried, tasks, chunksize=4) for row in rows_of_one]
        if found:
            print(line(kind, found), flush=True)
        rows += found
    for low, high in ((0.5, 0.7), (0.7, 0.85), (0.85, 0.95), (0.95, 0.99), (0.99, 1.01)):
        inside = [row for row in rows if low <= row[2] < high]
        if inside:
            print(line(f"claimed {low:.2f}-{min(high, 1.0):.2f}", inside))
    several = [row for row in rows if row[1] > 1]
    if several:
        print(line("with rivals", several))
    if rows:
        print(line("all", rows))


if __name__ == "__main__":
    main(sys.argv[1:])
