"""The auditor's power beside an oracle's, and its intervals where the oracle would find four faults in five.

    python -m tests.bench.power_tables meter_offset lot_strength --seeds 400 --cover 2000

The oracle knows the one true candidate; it names a fault when its gain passes the auditor's own family-wise critical
value. It is asked twice: knowing the true spreads as well, and estimating them from the record as the auditor must. The
critical value is the one that the auditor holds against the true candidate in that record. From them and the oracle's
scores follow the sizes at which it finds 50, 80 and 95 % of the records; both judge the same ones.
"""

from __future__ import annotations

import argparse
import inspect
import sys
import zlib
from collections.abc import Sequence
from multiprocessing import get_context

import numpy as np

from reconcile.auditor.alarm import Alarm, score_df
from reconcile.auditor.estimates import critical_score
from reconcile.records.arrays import FloatArray
from tests.bench.blame_run import Case, Result, run_all, search_of
from tests.bench.blame_tables import share, size_ratios
from tests.simulated.oracle import ask
from tests.simulated.simulator import FAULTS, simulate

POWERS = (0.50, 0.80, 0.95)
FACTORS = ("batch_preparation", "lot_strength")
"""Kinds whose size is a factor; of the others it is a difference."""
SIZED = (*FACTORS, "meter_offset", "meter_span", "meter_drift", "meter_step", "probe_matrix", "calibration_buffer")


def _consult(task: tuple[int, str, float]) -> tuple[float, float, float]:
    seed, kind, size = task
    asked = ask(seed, kind, size)
    oracle = asked.with_spreads()
    return oracle.value, oracle.mean, asked.without_spreads().value


def consulted(
    kind: str, size: float, seeds: Sequence[int], processes: int
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """The oracle's scores with the spreads known, their means, and its scores with them estimated, (seeds,) each."""
    tasks = [(seed, kind, size) for seed in seeds]
    if not processes:
        found = [_consult(task) for task in tasks]
    else:
        with get_context("fork").Pool(processes) as pool:
            found = pool.map(_consult, tasks, chunksize=8)
    table = np.array(found)
    return table[:, 0], table[:, 1], table[:, 2]


def scaled(kind: str, size: float, times: float) -> float:
    """A size `times` as large; factors by their logarithm."""
    return float(np.exp(times * np.log(size))) if kind in FACTORS else size * times


def run_at(kind: str, size: float, seeds: Sequence[int], processes: int) -> list[Result]:
    return run_all([Case(seed, (kind,), {kind: size}) for seed in seeds], processes)


def critical_of(task: tuple[int, str, float]) -> float:
    """Gain that the true candidate of (seed, kind, size) needs in the auditor's eyes."""
    seed, kind, size = task
    simulated = simulate(seed, [kind], {kind: size})
    search = search_of(simulated)
    pool, _, scores = search.scored(search.components([]), [])
    planted = simulated.truth[0]
    told = [(k, pool.candidate(k)) for k in range(len(pool))]
    mine = [k for k, c in told if (c.kind, str(c.subject)) == (planted.kind, str(planted.subject))]
    best = max(mine, key=lambda k: float(scores.marginal[k]))
    model = search.model(search.components([pool.candidate(best)]), [])
    df = score_df(model, pool.columns(np.array([best])))[:, 0]
    seed_of_draws = zlib.crc32(pool.candidate(best).alarm_class.encode())
    return 0.5 * critical_score(Alarm(pool, model), best, df, search.rate, seed_of_draws) ** 2


def critical_gains(kind: str, size: float, seeds: Sequence[int], processes: int) -> FloatArray:
    """Gain that the true candidate of each record needs in the auditor's eyes, (seeds,)."""
    tasks = [(seed, kind, size) for seed in seeds]
    with get_context("fork").Pool(max(processes, 1)) as pool:
        return np.array(pool.map(critical_of, tasks, chunksize=4))


def sizes_for(value: FloatArray, mean: FloatArray, critical: FloatArray) -> list[float]:
    """Multiples of the size behind `value` and `mean` at which the oracle finds each share of POWERS in these records.

    A record's score is what its clean part gives, and its mean times the multiple.
    """

    def power(times: float) -> float:
        score = value + mean * (times - 1.0)
        return float(np.mean(0.5 * score**2 >= critical))

    grid = np.linspace(0.02, 3.0, 1500)
    found = np.array([power(times) for times in grid])
    return [float(grid[np.argmax(found >= want)]) for want in POWERS]


def table(kind: str, options: argparse.Namespace) -> None:
    """Both curves of one kind, and its intervals."""
    seeds = range(options.first, options.first + options.seeds)
    full = float(inspect.signature(FAULTS[kind]).parameters["size"].default)
    value, mean, _ = consulted(kind, full, seeds, options.processes)
    times = 4.3 / float(np.median(mean))
    critical = critical_gains(kind, scaled(kind, full, times), seeds, options.processes)
    least, middle, most = np.quantile(critical, (0.1, 0.5, 0.9))
    print(f"{kind}: gains the auditor asks for {least:.1f}, {middle:.1f}, {most:.1f} (10, 50, 90 % points)", flush=True)
    for want, multiple in zip(POWERS, sizes_for(value, mean, critical), strict=True):
        size = scaled(kind, full, multiple)
        oracle, _, asking = consulted(kind, size, seeds, options.processes)
        more = range(options.first, options.first + max(options.cover, options.seeds)) if want == 0.8 else seeds
        results = run_at(kind, size, more, options.processes)
        paired = results[: options.seeds]
        named = sum(r.outcomes[0] == "named" for r in paired)
        covered = sum(r.outcomes[0] != "missed" for r in paired)
        stray = sum(bool(r.stray) for r in paired)
        n = len(paired)
        print(
            f"{kind:18} size {size:8.4f}   oracle {share(int((0.5 * oracle**2 >= critical).sum()), n)}   "
            f"spreads estimated {share(int((0.5 * asking**2 >= critical).sum()), n)}   covered "
            f"{share(covered, n)}   named {share(named, n)}   stray {share(stray, n)}",
            flush=True,
        )
        if want == 0.8 and options.cover:
            held, signed, ratio = size_ratios(results)
            m = len(ratio)
            bias = (
                f"mean {100 * (np.mean(ratio) - 1):+.1f} %, middle {100 * (np.median(ratio) - 1):+.1f} %" if m else "-"
            )
            print(
                f"{'':18} {m} found: interval holds {share(held, m)}   sign {share(signed, m)}   bias {bias}",
                flush=True,
            )


def main(arguments: Sequence[str]) -> None:
    """Print the tables of the kinds asked for."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("kinds", nargs="+", choices=sorted(SIZED))
    parser.add_argument("--seeds", type=int, default=400)
    parser.add_argument("--cover", type=int, default=0, help="records for the intervals, at the size of 80 %%")
    parser.add_argument("--first", type=int, default=0)
    parser.add_argument("--processes", type=int, default=2)
    options = parser.parse_args(arguments)
    for kind in options.kinds:
        table(kind, options)


if __name__ == "__main__":
    main(sys.argv[1:])
