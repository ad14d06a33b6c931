"""Every command explains itself, and README.md mentions what there is and shows what it prints."""

from __future__ import annotations

import re
import shlex
import subprocess
from pathlib import Path

import pytest
import typer.main
from command_line import Run

from reconcile.cli.app import app
from reconcile.records.settings import SETTINGS

ROOT = Path(__file__).parents[2]
README = (ROOT / "README.md").read_text(encoding="utf-8")
COMMANDS = typer.main.get_command(app).commands  # type: ignore[attr-defined]


def options_of(command: str) -> set[str]:
    return {name for p in COMMANDS[command].params for name in p.opts if name.startswith("--")} - {"--help"}


def sh_blocks() -> list[str]:
    return re.findall(r"^```sh\n(.*?)\n```$", README, re.MULTILINE | re.DOTALL)


def test_the_commands_offered() -> None:
    assert set(COMMANDS) == {"read", "predict", "audit", "meters", "pka", "substances", "newbook", "recheck"}


@pytest.mark.parametrize("command", sorted(COMMANDS))
def test_help_has_an_example_that_can_be_typed(run: Run, command: str) -> None:
    done = run(command, "--help")
    assert done.code == 0
    examples = re.findall(rf"^ +reconcile {command} (.+)$", done.out, re.MULTILINE)
    assert examples
    for example in examples:
        used = {word for word in shlex.split(example) if word.startswith("--")}
        assert used <= options_of(command)


@pytest.mark.parametrize("command", sorted(COMMANDS))
def test_every_option_has_help(run: Run, command: str) -> None:
    assert all(getattr(p, "help", None) for p in COMMANDS[command].params if p.param_type_name == "option")
    shown = run(command, "--help").out
    for p in COMMANDS[command].params:
        if p.param_type_name == "argument":  # whose help only the newest versions of the parser keep with it
            assert re.search(rf"^ +\W?{re.escape(str(p.metavar))}\S* +\S", shown, re.MULTILINE), p.name
    assert COMMANDS[command].help


@pytest.mark.parametrize("command", sorted(COMMANDS))
def test_the_readme_mentions_every_command_and_option(command: str) -> None:
    assert f"`reconcile {command} " in README
    for option in options_of(command):
        assert f"`{option}" in README, option


def shown(default: object) -> str:
    if isinstance(default, bool):
        return str(default).lower()
    return f"`{list(default)}`" if isinstance(default, tuple) else str(default)


def test_the_readme_lists_every_setting_as_it_is() -> None:
    rows = [f"| `{s.name}` | {shown(s.default)} | {s.unit} | {s.reason} |" for s in SETTINGS]
    missing = [row for row in rows if row not in README]
    assert not missing, "README.md, Settings: these rows are missing or differ:\n" + "\n".join(missing)


def test_the_readme_shows_what_a_prediction_prints(run: Run) -> None:
    shown = re.search(r"^```console\n\$ reconcile (.+?)\n(.*?)\n```$", README, re.MULTILINE | re.DOTALL)
    assert shown
    assert run(*shlex.split(shown.group(1))).out.rstrip() == shown.group(2)


def test_the_first_python_example_runs_as_it_stands(capsys: pytest.CaptureFixture[str]) -> None:
    example = re.search(r"^```python\n(.*?)\n```$", README, re.MULTILINE | re.DOTALL)
    assert example
    exec(example.group(1), {})
    assert capsys.readouterr().out.count("[") == 2  # two arrays


def test_the_first_two_commands_are_one_line_each_and_stand_alone() -> None:
    audit, checks = sh_blocks()[:2]
    for line in (audit, checks):
        assert "\n" not in line
        assert line.startswith("(test -x .venv/bin/pip || python3 -m venv .venv) && .venv/bin/pip install")
    assert audit.endswith("audit sample_data/solution_room.xlsx --out reports/solution_room --replace")
    for tool in ("ruff check", "ruff format --check", "mypy", "pytest"):
        assert f".venv/bin/{tool}" in checks


def test_ci_runs_the_second_command_as_it_stands() -> None:
    script = (ROOT / ".ci" / "run").read_text(encoding="utf-8")
    before, run, after = script.partition('\nbash -euo pipefail -c "$command"\n')
    assert run
    assert after.split() == [".ci/lowest", ".ci/dependencies"]
    dry = before.replace('"$(dirname "${BASH_SOURCE[0]}")/.."', str(ROOT))
    printed = subprocess.run(["bash", "-c", dry], capture_output=True, text=True, check=True).stdout
    assert printed.rstrip("\n") == sh_blocks()[1]


def test_the_doors_open() -> None:
    import reconcile

    for name in reconcile.__all__:
        assert getattr(reconcile, name)
    with pytest.raises(AttributeError):
        _ = reconcile.fit_everything


def test_version(run: Run) -> None:
    import reconcile

    assert run("--version").out.strip() == f"reconcile {reconcile.__version__}"
