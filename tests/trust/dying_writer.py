"""Writes report folders over one another in children that die, and prints what each of them left, as JSON.

    dying_writer.py FOLDER exchange|journal kill|interrupt|failure|moments

kill, interrupt, failure : the n-th child is killed, interrupted or told of a full disk at its n-th line of code, until
    one gets through; moments : 30 children that write again and again are killed at random moments (seeded).
A process of its own, because it forks and imports little: a child costs milliseconds.
"""

from __future__ import annotations

import json
import os
import random
import signal
import sys
import time
from pathlib import Path
from types import FrameType
from typing import Any

from reconcile.reporter import exchange, folder, working_place

WATCHED = {exchange.__file__, folder.__file__, working_place.__file__}
MOMENTS, SEED = 30, 20250304
NAMES = ("residuals.csv", "findings.json", "plots/a.svg", "plots/b.svg", "manifest.json")


def files(version: int) -> dict[str, bytes]:
    return {name: f"{name} {version}\n".encode() * 500 for name in NAMES}


def write(report: Path, version: int) -> None:
    working_place.settle(report.parent)
    folder.put_folder(report, files(version), lambda: None)


def standing(report: Path) -> int | str:
    """Version of the report that stands there whole, or what is wrong with it."""
    if not report.exists():
        return "absent"
    held = {p.relative_to(report).as_posix(): p.read_bytes() for p in report.rglob("*") if p.is_file()}
    version = int(held.get("manifest.json", b"x 0\n").split(b"\n")[0].split()[1])
    return version if held == files(version) else "torn"


def left(report: Path) -> list[str]:
    return sorted(p.name for p in report.parent.iterdir() if p != report)


def end_at_line(count: int, end: str) -> list[int]:
    """Let this process end, or be disturbed, at the count-th line of the watched files; gives the lines disturbed."""
    seen, disturbed = 0, []

    def trace(frame: FrameType, event: str, _: Any) -> Any:
        nonlocal seen
        if frame.f_code.co_filename not in WATCHED:
            return None
        if event == "line":
            seen += 1
            if seen == count:
                disturbed.append(frame.f_lineno)
                if end == "kill":
                    os.kill(os.getpid(), signal.SIGKILL)
                raise KeyboardInterrupt if end == "interrupt" else OSError(28, "No space left on device")
        return trace

    sys.settrace(trace)
    return disturbed


def child(report: Path, version: int, count: int, end: str) -> int:
    """Exit code of a child that writes a version: 0 undisturbed, 2 done in spite of it, 1 not done, -9 killed."""
    pid = os.fork()
    if pid == 0:
        code = 7
        try:
            disturbed = end_at_line(count, end)
            write(report, version)
            code = 2 if disturbed else 0
        except (KeyboardInterrupt, OSError):
            code = 1
        finally:
            os._exit(code)
    return os.waitstatus_to_exitcode(os.waitpid(pid, 0)[1])


def endless_child(report: Path, version: int, seconds: float) -> int:
    """Exit code of a child that writes one version after the other until it is killed."""
    pid = os.fork()
    if pid == 0:
        while True:
            write(report, version)
            version += 1
    time.sleep(seconds)
    os.kill(pid, signal.SIGKILL)
    return os.waitstatus_to_exitcode(os.waitpid(pid, 0)[1])


def main(report: Path, way: str, end: str) -> list[dict[str, Any]]:
    if way == "journal":
        folder.exchange = lambda one, other: False  # type: ignore[assignment]
    rng = random.Random(SEED)
    write(report, 1)
    outcomes: list[dict[str, Any]] = []
    for n in range(1, MOMENTS + 1 if end == "moments" else 1000):
        before, version = standing(report), 1000 * n
        if end == "moments":
            code = endless_child(report, version, rng.uniform(0.0, 0.03))
        else:
            code = child(report, version, n, end)
        found = {"code": code, "before": before, "version": version, "found": standing(report), "left": left(report)}
        working_place.settle(report.parent)
        outcomes.append(found | {"settled": standing(report), "left_after": left(report)})
        if code == 0:
            break
    return outcomes


if __name__ == "__main__":
    print(json.dumps(main(Path(sys.argv[1]), sys.argv[2], sys.argv[3])))
