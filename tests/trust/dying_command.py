"""Runs `reconcile audit ... --replace` in children that are killed, and prints what they left.

    dying_command.py FOLDER FILE...        FOLDER: the report's; seeded, and forked once everything is imported

Every second child is killed at a random moment of its run, the others within hundredths of a second from when they
begin to write.
"""

from __future__ import annotations

import hashlib
import io
import json
import os
import random
import signal
import sys
import time
from contextlib import redirect_stderr, redirect_stdout
from pathlib import Path
from typing import Any

from reconcile.cli.app import app

MOMENTS, SEED = 8, 20250305
WRITING = 0.02
"""Seconds that writing takes, about."""


def run(report: Path, files: list[str]) -> int:
    said = io.StringIO()
    with redirect_stdout(said), redirect_stderr(said):
        return int(app(["audit", *files, "--out", str(report), "--replace"], standalone_mode=False) or 0)


def whole(report: Path) -> bool:
    """Whether the report is there with every file that its manifest names, and nothing else."""
    document = json.loads((report / "manifest.json").read_text(encoding="utf-8"))
    listed = {o["name"]: o["sha256"] for o in document["outputs"]}
    held = {p.relative_to(report).as_posix(): p.read_bytes() for p in report.rglob("*") if p.is_file()}
    del held["manifest.json"]
    return {name: hashlib.sha256(content).hexdigest() for name, content in held.items()} == listed


def main(report: Path, files: list[str]) -> dict[str, Any]:
    run(report, files)
    begin = time.perf_counter()
    run(report, files)
    duration = time.perf_counter() - begin
    rng = random.Random(SEED)
    kills = []
    for n in range(MOMENTS):
        pid = os.fork()
        if pid == 0:
            os._exit(run(report, files))
        if n % 2:
            time.sleep(rng.uniform(0.0, duration))
        else:
            patience = time.perf_counter() + 10.0 * duration
            while not list(report.parent.glob(".*")) and time.perf_counter() < patience:
                time.sleep(0.0005)
            time.sleep(rng.uniform(0.0, WRITING))
        os.kill(pid, signal.SIGKILL)
        code = os.waitstatus_to_exitcode(os.waitpid(pid, 0)[1])
        kills.append({"code": code, "whole": whole(report), "left": len(list(report.parent.glob(".*")))})
    last = run(report, files)
    return {"kills": kills, "last": last, "whole": whole(report), "beside": [p.name for p in report.parent.iterdir()]}


if __name__ == "__main__":
    print(json.dumps(main(Path(sys.argv[1]), sys.argv[2:])))
