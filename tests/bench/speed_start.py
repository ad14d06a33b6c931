"""How long commands take to start, as ratios to `python -c "import numpy"` measured in one run.

Run as `python tests/bench/speed_start.py`. Each command runs in turn, again and again; counted is the least processor
time of its processes. Nothing here asserts.
"""

from __future__ import annotations

import resource
import subprocess
import sys

ROUNDS = 9
COMMANDS: dict[str, list[str]] = {
    "import numpy": ["-c", "import numpy"],
    "reconcile --help": ["-m", "reconcile", "--help"],
    "reconcile predict": ["-m", "reconcile", "predict", "0.1 M acetic acid", "--at", "25"],
    "reconcile substances": ["-m", "reconcile", "substances", "acetate"],
}


def seconds(words: list[str]) -> float:
    before = resource.getrusage(resource.RUSAGE_CHILDREN)
    subprocess.run([sys.executable, *words], capture_output=True, check=True)
    after = resource.getrusage(resource.RUSAGE_CHILDREN)
    return after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime


def main() -> None:
    least = dict.fromkeys(COMMANDS, float("inf"))
    for _ in range(ROUNDS):
        for name, words in COMMANDS.items():
            least[name] = min(least[name], seconds(words))
    numpy = least["import numpy"]
    for name, spent in least.items():
        print(f"{name:22}{1000 * spent:7.0f} ms{spent / numpy:7.2f}")


if __name__ == "__main__":
    main()
