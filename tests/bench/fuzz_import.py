"""Change bytes of small workbooks and CSV files at random and import them: every outcome is a record or a refusal.

Run as `python tests/bench/fuzz_import.py [seconds] [seed]`. Prints the number of files, of records and of refusals by
code, the slowest file and the memory; stops with the seed of the first file that gives anything else.
"""

from __future__ import annotations

import random
import resource
import sys
import tempfile
import time
import zipfile
from collections import Counter
from collections.abc import Callable
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parents[1]))
sys.path.insert(0, str(Path(__file__).parents[1] / "importer"))

from builders import csv_text
from wild_case import HEAD, RECIPES, book, readings

from reconcile.importer.read import read_books
from reconcile.records.problems import InputProblems

SNIPPETS = [
    b"1e400", b'"', b"\x00", b"\xff\xfe", b"<f>A1</f>", b't="e"', b't="s"', b's="9999"', b'r="XFD9"', b"4,71", b"=1+1",
    b"&#x0;", b"</c>", b"<row>", b"\xc2\xa0", b";", b"\t", b"-", b"NaN", b"2026-13-45", b"99999999999999999999",
    b'<mergeCell ref="A1:ZZ99999"/>', b'ref="B2:A1"', b"\r", b"\n\n", b"pH", b"Batch", b"Mean", b"x:", b'hidden="1"',
]  # fmt: skip


def damaged(data: bytes, rng: random.Random) -> bytes:
    """Some bytes changed, left out, said twice or put in."""
    out = bytearray(data)
    for _ in range(rng.randint(1, 6)):
        at = rng.randrange(len(out) + 1)
        way = rng.randrange(4)
        if way == 0 and out:
            out[at % len(out)] = rng.randrange(256)
        elif way == 1:
            del out[at : at + rng.randint(1, 20)]
        elif way == 2:
            out[at:at] = out[at : at + rng.randint(1, 40)]
        else:
            out[at:at] = rng.choice(SNIPPETS)
    return bytes(out)


def workbook_makers(folder: Path) -> Callable[[random.Random], bytes]:
    """A function that damages either the archive or one part inside it."""
    whole = book(folder, [*readings(4), [None, "Mean", None, None, 4.7]], formats={"Readings!E2": "0.00"}).read_bytes()
    with zipfile.ZipFile(folder / "record.xlsx") as archive:
        parts = {n: archive.read(n) for n in archive.namelist()}

    def make(rng: random.Random) -> bytes:
        if rng.random() < 0.2:
            return damaged(whole, rng)
        target = rng.choice([n for n in parts if n.startswith("xl/") and "theme" not in n])
        path = folder / "inner.xlsx"
        with zipfile.ZipFile(path, "w") as new:
            for name, data in parts.items():
                new.writestr(name, damaged(data, rng) if name == target else data)
        return path.read_bytes()

    return make


def main() -> None:
    """Fuzz for the seconds given."""
    seconds = float(sys.argv[1]) if len(sys.argv) > 1 else 30.0
    seed = int(sys.argv[2]) if len(sys.argv) > 2 else 0
    outcomes: Counter[str] = Counter()
    slowest = 0.0
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        make = workbook_makers(folder)
        rows = [[str(c) for c in row] for row in readings(4)]
        text = (csv_text([HEAD, *rows]) + csv_text([[], *RECIPES])).encode()
        began = time.monotonic()
        while time.monotonic() - began < seconds:
            rng = random.Random(seed)
            is_book = rng.random() < 0.6
            path = folder / ("f.xlsx" if is_book else "f.csv")
            path.write_bytes(make(rng) if is_book else damaged(text, rng))
            start = time.monotonic()
            try:
                records = read_books([path])
                assert records.rows_read == len(records.readings) + len(records.set_aside)
                for problem in records.notes:
                    problem.message()
                outcomes["record"] += 1
            except InputProblems as refused:
                str(refused)
                outcomes[refused.problems[0].code] += 1
            except BaseException:
                print(f"seed {seed}: neither a record nor a refusal", file=sys.stderr)
                raise
            slowest = max(slowest, time.monotonic() - start)
            seed += 1
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    print(f"{sum(outcomes.values())} files, next seed {seed}, slowest {slowest:.2f} s, peak {peak:.0f} MiB")
    for code, count in outcomes.most_common():
        print(f"{count:7d}  {code}")


if __name__ == "__main__":
    main()
