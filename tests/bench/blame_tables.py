"""Tables of how far the auditor can be trusted, on simulated records.

    python -m tests.bench.blame_tables clean    --seeds 300     false alarms of clean records, default and stressed
    python -m tests.bench.blame_tables one      --seeds 100     one planted fault a record, by kind
    python -m tests.bench.blame_tables two      --seeds 200     two planted faults a record
    python -m tests.bench.blame_tables cover    --seeds 500     intervals, signs and bias of the estimates, by kind
    python -m tests.bench.blame_tables power meter_offset --at 0.02 0.03 0.05 --gain 9   named, covered, oracle, by size
    python -m tests.bench.blame_tables missed --seeds 50    planted faults not named, with what an oracle would gain
    python -m tests.bench.blame_tables time     --seeds 50      milliseconds a record
    python -m tests.bench.blame_tables show meter_offset 17     one record: what was planted, what was found

--only NAME... keeps the rows so named; --processes 0 stays in this process (for a debugger);
--first N is the first seed.
"""

from __future__ import annotations

import argparse
import sys
from collections import Counter
from collections.abc import Callable, Sequence
from typing import Any

import numpy as np

from tests.bench.blame_run import Case, Result, Told, run, run_all
from tests.simulated.oracle import DECIDED_BY_DISPLAY, consult
from tests.simulated.simulator import FAULTS

ROOMS: dict[str, dict[str, Any]] = {
    "default": {},
    "t noise, 4 d.f.": {"noise_shape": "t4"},
    "noise x 1.6": {"noise": 0.0192},
    "meter-day 0.015": {"meter_day_sd": 0.015},
    "all spreads x 1.5": {"spread": 1.5},
    "display 0.1": {"resolution": 0.1},
    "Davies 0.2": {"davies": 0.2},
    "Davies 0.4": {"davies": 0.4},
    "u(pKa) x 2 (0.02)": {"pka_u": 2.0},
    "noise 0.03": {"noise": 0.03},
    "noise 0.05": {"noise": 0.05},
    "rectangular lots": {"strength_shape": "rectangular"},
    "single-use lots": {"single_use_lots": 6},
    "sessions 0.01": {"session_sd": 0.01, "calibrations": True},
    "check readings": {"checks_per_meter": 4},
}
"""Clean rooms: the default, the stresses that an auditor must bear, and some that it should."""
MAIN = (
    "meter_offset",
    "meter_span",
    "meter_drift",
    "meter_step",
    "lot_strength",
    "lot_identity",
    "batch_preparation",
    "reading_slip",
    "meter_stuck",
    "meter_temperature",
    "lot_hydrate",
    "probe_matrix",
)
FURTHER = tuple(name for name in FAULTS if name not in MAIN)


def share(count: int, of: int) -> str:
    """A share in per cent with its 95 % interval (Wilson 1927, J. Am. Stat. Assoc. 22, 209)."""
    if not of:
        return "      -         "
    p, z = count / of, 1.959964
    middle, half = (p + z * z / (2 * of)), z * np.sqrt(p * (1 - p) / of + z * z / (4 * of * of))
    low, high = (abs(middle + s * half) / (1 + z * z / of) for s in (-1, 1))
    return f"{100 * p:5.1f} [{100 * low:4.1f},{100 * high:5.1f}]"


def _seeds(options: argparse.Namespace) -> range:
    return range(options.first, options.first + options.seeds)


def _kept(names: Sequence[str], options: argparse.Namespace) -> list[str]:
    return [name for name in names if not options.only or name in options.only]


def clean(options: argparse.Namespace) -> None:
    """False alarms: share of clean records with any finding, and what was found."""
    print(f"{'clean records':22} {'any finding, %':18} kinds found")
    for name in _kept(list(ROOMS), options):
        results = run_all([Case(seed, room=ROOMS[name]) for seed in _seeds(options)], options.processes)
        kinds = Counter(told.kind for r in results for told in r.stray)
        listed = ", ".join(f"{kind} {n}" for kind, n in kinds.most_common()) or "none"
        print(f"{name:22} {share(sum(bool(r.stray) for r in results), len(results))}   {listed}", flush=True)


def _row(name: str, results: list[Result]) -> str:
    outcomes = [o for r in results for o in r.outcomes]
    named, reached = outcomes.count("named"), len(outcomes) - outcomes.count("missed")
    stray = sum(bool(r.stray) for r in results)
    kinds = Counter(told.kind for r in results for told in r.stray)
    listed = ", ".join(f"{kind} {n}" for kind, n in kinds.most_common(3))
    n = len(outcomes)
    return f"{name:20} {share(named, n)}   {share(reached, n)}   {share(stray, len(results))}   {listed}"


HEAD = f"{'planted':20} {'named, %':18} {'named or rival':18} {'any stray':18} strays"


def one(options: argparse.Namespace) -> None:
    """One fault a record: named, named or among the best three rivals, records with a stray finding."""
    print(HEAD)
    room = ROOMS[options.room]
    pooled: list[Result] = []
    for name in _kept([*MAIN, *FURTHER], options):
        results = run_all([Case(seed, (name,), room=room) for seed in _seeds(options)], options.processes)
        print(_row(name, results), flush=True)
        pooled += results if name in MAIN else []
    if pooled:
        print(_row("pooled, main kinds", pooled))


def two(options: argparse.Namespace) -> None:
    """Two faults a record, kinds drawn by the seed from the main ones."""
    names = _kept(MAIN, options)
    cases = []
    for seed in _seeds(options):
        pair = np.random.default_rng([seed, 9]).choice(len(names), 2, replace=False)
        cases.append(Case(seed, tuple(names[i] for i in pair)))
    results = run_all(cases, options.processes)
    print(HEAD)
    print(_row("each of two", results))
    both = sum("missed" not in r.outcomes for r in results)
    named = sum(set(r.outcomes) == {"named"} for r in results)
    print(f"both named or rival: {share(both, len(results))} %;  both named: {share(named, len(results))} %")


def size_ratios(results: Sequence[Result]) -> tuple[int, int, list[float]]:
    """How many intervals hold the truth, how many signs are right, and found over true size, of faults that were found.

    A preparation error counts where the finding has the component right: of two in a buffer either may explain it.
    """
    held = signed = 0
    ratio: list[float] = []
    for result in results:
        planted, told = result.truth[0], result.told[0]
        true = planted.size if planted.size is not None else planted.detail.get("factor")
        if told is None or told.estimate is None or told.interval is None or true is None:
            continue
        if told.component != planted.detail.get("component", told.component):
            continue
        held += told.interval[0] <= true <= told.interval[1]
        factor = (planted.unit == "-" and planted.subject_type in ("lot", "batch")) or planted.size is None
        a, b = (np.log(told.estimate), np.log(true)) if factor else (told.estimate, true)
        signed += bool(np.sign(a) == np.sign(b))
        ratio.append(float(a / b))
    return held, signed, ratio


def cover(options: argparse.Namespace) -> None:
    """Intervals that hold the truth, right signs and mean bias, of planted faults that were found."""
    print(f"{'planted':20} {'found':>6}   {'interval holds, %':18} {'sign right, %':18} {'bias, % of size':>15}")
    for name in _kept([*MAIN, *FURTHER], options):
        results = run_all([Case(seed, (name,)) for seed in _seeds(options)], options.processes)
        held, signed, ratio = size_ratios(results)
        bias = f"{100 * (np.mean(ratio) - 1):+.1f}" if ratio else "-"
        n = len(ratio)
        print(f"{name:20} {n:6d}   {share(held, n)}   {share(signed, n)}   {bias:>15}", flush=True)


def power(options: argparse.Namespace) -> None:
    """Share of records in which the planted fault is named, and covered, by size, and in which an oracle would name it.

    The oracle tests the true candidate with the true spreads at --gain, the gain at which the auditor's p is its share.
    """
    print(f"{'size':>8}   {'named, %':21}{'named or rival':21}{'any stray':21}{'oracle, %':21}strays")
    for size in options.at:
        cases = [Case(seed, (options.kind,), {options.kind: size}) for seed in _seeds(options)]
        told = _row("", run_all(cases, options.processes))[21:]
        oracle = ""
        if options.kind not in DECIDED_BY_DISPLAY:
            sure = sum(consult(seed, options.kind, size).gain >= options.gain for seed in _seeds(options))
            oracle = share(sure, options.seeds)
        print(f"{size:8g}   {told[:60]}   {oracle}   {told[63:]}", flush=True)


def missed(options: argparse.Namespace) -> None:
    """Every planted fault that is not the finding, with the gain that an oracle would have (it knows the candidate)."""
    for name in _kept([*MAIN, *FURTHER], options):
        for result in run_all([Case(seed, (name,)) for seed in _seeds(options)], options.processes):
            if result.outcomes[0] == "named" and not result.stray:
                continue
            known = name not in DECIDED_BY_DISPLAY and name != "record_value"
            gain = f"oracle {consult(result.case.seed, name).gain:6.1f}" if known else ""
            planted = result.truth[0]
            print(f"{name:18} {result.case.seed:5d} {result.outcomes[0]:7} {planted.subject} {gain}", flush=True)
            for told in (result.told[0], *result.stray):
                if told is not None:
                    print(f"      {_line(told)}")


def timing(options: argparse.Namespace) -> None:
    """Milliseconds a record: simulate, predict, audit; clean and with one fault."""
    print(f"{'record':20} {'simulate':>24} {'predict':>24} {'audit':>24}   (ms: least, median, greatest)")
    for name in _kept(["clean", *MAIN], options):
        faults = () if name == "clean" else (name,)
        results = run_all([Case(seed, faults) for seed in _seeds(options)], options.processes)
        cells = []
        for part in np.array([r.seconds for r in results]).T * 1000.0:
            cells.append(f"{part.min():7.1f} {np.median(part):7.1f} {part.max():7.1f} ")
        print(f"{name:20} {''.join(f'{c:>25}' for c in cells)}", flush=True)


def _line(told: Told | None) -> str:
    if told is None:
        return "nothing"
    interval = f" [{told.interval[0]:.4g}, {told.interval[1]:.4g}]" if told.interval else ""
    estimate = f" {told.estimate:.4g}" if told.estimate is not None else ""
    rivals = f"; rivals: {', '.join(f'{k} {s}' for k, s in told.rivals)}" if told.rivals else ""
    return f"{told.kind} {told.subject}{estimate}{interval} gain {told.gain:.1f} p {told.p:.2g}{rivals}"


def show(options: argparse.Namespace) -> None:
    """One record: planted and found."""
    faults = () if options.kind == "clean" else tuple(options.kind.split("+"))
    result = run(Case(options.seed, faults, room=ROOMS[options.room]))
    for planted, outcome, told in zip(result.truth, result.outcomes, result.told, strict=True):
        print(f"planted: {planted.kind} {planted.subject} {planted.size} {dict(planted.detail)}")
        print(f"   {outcome}: {_line(told)}")
    for told in result.stray:
        print(f"stray: {_line(told)}")


TABLES: dict[str, Callable[[argparse.Namespace], None]] = {
    "clean": clean,
    "one": one,
    "two": two,
    "cover": cover,
    "power": power,
    "missed": missed,
    "time": timing,
    "show": show,
}


def main(arguments: Sequence[str]) -> None:
    """Print one table."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    tables = parser.add_subparsers(dest="table", required=True)
    for name, table in TABLES.items():
        sub = tables.add_parser(name, help=(table.__doc__ or "").splitlines()[0])
        if name in ("power", "show"):
            sub.add_argument("kind")
        if name == "show":
            sub.add_argument("seed", type=int)
        sub.add_argument("--seeds", type=int, default=100)
        sub.add_argument("--first", type=int, default=0)
        sub.add_argument("--processes", type=int, default=2)
        sub.add_argument("--only", nargs="*", default=[])
        sub.add_argument("--room", choices=list(ROOMS), default="default")
        sub.add_argument("--gain", type=float, default=9.0)
        sub.add_argument("--at", type=float, nargs="*", default=[])
    options = parser.parse_args(arguments)
    TABLES[options.table](options)


if __name__ == "__main__":
    main(sys.argv[1:])
