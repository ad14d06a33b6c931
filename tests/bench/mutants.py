"""Which small changes to chemistry/ and auditor/ no test notices: python tests/bench/mutants.py [number] [room] [seed]

A seeded sample of single changes (a comparison turned, an operator exchanged, a number moved, a condition negated),
each in a copy of the package of its own, with the tests of the room run against it until one fails. Printed are the
survivors with file, line and change, and the share caught. Annotations and words are left alone. Nothing here asserts.
"""

from __future__ import annotations

import ast
import copy
import os
import random
import shutil
import subprocess
import sys
import tempfile
from collections.abc import Iterator
from pathlib import Path

ROOT = Path(__file__).parents[2]
TESTS: dict[str, list[str]] = {
    "chemistry": ["tests/chemistry", "tests/published", "tests/properties", "tests/records"],
    "auditor": ["tests/auditor", "tests/simulated/test_sample_workbooks.py"],
}
PATIENCE = 1200
"""Seconds after which a mutant counts as caught: it does not end."""
OPERATORS: dict[type[ast.AST], type[ast.AST]] = {
    ast.Add: ast.Sub, ast.Sub: ast.Add, ast.Mult: ast.Div, ast.Div: ast.Mult, ast.Lt: ast.GtE, ast.GtE: ast.Lt,
    ast.Gt: ast.LtE, ast.LtE: ast.Gt, ast.Eq: ast.NotEq, ast.NotEq: ast.Eq, ast.And: ast.Or, ast.Or: ast.And,
    ast.BitAnd: ast.BitOr, ast.BitOr: ast.BitAnd,
}  # fmt: skip


def places(tree: ast.AST) -> Iterator[tuple[int, str]]:
    """(number of the node in the order of a walk, what can be done there)."""
    annotated = {id(n) for node in ast.walk(tree) for n in ast.walk(getattr(node, "annotation", None) or ast.Pass())}
    annotated |= {id(n) for node in ast.walk(tree) for n in ast.walk(getattr(node, "returns", None) or ast.Pass())}
    for number, node in enumerate(ast.walk(tree)):
        if id(node) in annotated:
            continue
        if isinstance(node, (ast.BinOp, ast.AugAssign, ast.BoolOp)) and type(node.op) in OPERATORS:
            yield number, "operator"
        elif isinstance(node, ast.Compare) and type(node.ops[0]) in OPERATORS:
            yield number, "comparison"
        elif isinstance(node, ast.Constant) and type(node.value) in (int, float):
            yield number, "number"
        elif isinstance(node, (ast.If, ast.IfExp)) and "TYPE_CHECKING" not in ast.dump(node.test):
            yield number, "condition"


def changed(tree: ast.Module, number: int, what: str) -> tuple[ast.Module, str]:
    """A copy of a module with one node changed, and the change in words."""
    new = copy.deepcopy(tree)
    node = list(ast.walk(new))[number]
    before = ast.unparse(node.test if isinstance(node, (ast.If, ast.IfExp)) else node)
    if isinstance(node, (ast.BinOp, ast.AugAssign, ast.BoolOp)):
        node.op = OPERATORS[type(node.op)]()  # type: ignore[assignment]
    elif isinstance(node, ast.Compare):
        node.ops[0] = OPERATORS[type(node.ops[0])]()  # type: ignore[assignment]
    elif isinstance(node, ast.Constant):
        value = node.value
        assert isinstance(value, (int, float))
        node.value = value + 1 if isinstance(value, int) else value * 1.1 if value else 0.1
    elif isinstance(node, (ast.If, ast.IfExp)):
        node.test = ast.UnaryOp(ast.Not(), node.test)
    after = ast.unparse(node.test if isinstance(node, (ast.If, ast.IfExp)) else node)
    line = getattr(node, "lineno", 0)
    return ast.fix_missing_locations(new), f"line {line}, {what}: {before}  ->  {after}"


def caught(place: Path, room: str) -> bool:
    environment = os.environ | {"PYTHONPATH": str(place), "OMP_NUM_THREADS": "1", "PYTHONDONTWRITEBYTECODE": "1"}
    words = [sys.executable, "-m", "pytest", "-q", "-x", "-p", "no:cacheprovider", "-p", "no:randomly", *TESTS[room]]
    try:
        done = subprocess.run(words, cwd=place, env=environment, capture_output=True, timeout=PATIENCE, check=False)
    except subprocess.TimeoutExpired:
        return True
    return done.returncode != 0


def main(number: int, room: str, seed: int) -> None:
    files = sorted((ROOT / "reconcile" / room).rglob("*.py"))
    trees = {path: ast.parse(path.read_text(encoding="utf-8")) for path in files}
    every = [(path, node, what) for path, tree in trees.items() for node, what in places(tree)]
    sample = random.Random(seed).sample(every, min(number, len(every)))
    survivors = []
    with tempfile.TemporaryDirectory() as name:
        place = Path(name)
        for part in ("reconcile", "tests", "sample_data", "reports"):
            shutil.copytree(ROOT / part, place / part, ignore=shutil.ignore_patterns("__pycache__"))
        for extra in ("pyproject.toml", "README.md", "DEVELOPERS.md"):
            shutil.copy(ROOT / extra, place / extra)
        for path, node, what in sample:
            tree, words = changed(trees[path], node, what)
            copied = place / path.relative_to(ROOT)
            copied.write_text(ast.unparse(tree), encoding="utf-8")
            if not caught(place, room):
                survivors.append(f"{path.relative_to(ROOT)}, {words}")
                print(f"survives: {survivors[-1]}", flush=True)
            shutil.copy(path, copied)
    share = 100.0 * (len(sample) - len(survivors)) / max(len(sample), 1)
    print(f"{room}: {len(sample)} of {len(every):,} possible changes tried (seed {seed}), {share:.0f} % caught")


if __name__ == "__main__":
    main(
        int(sys.argv[1]) if len(sys.argv) > 1 else 40,
        sys.argv[2] if len(sys.argv) > 2 else "chemistry",
        int(sys.argv[3]) if len(sys.argv) > 3 else 1,
    )
