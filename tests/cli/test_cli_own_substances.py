"""reconcile substances --add: checked, kept, and known to predict, read, audit and pka; named in the manifest."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

Run = Callable[..., Any]

# an invented acid with the constant of acetic acid less 0.1; its masses by IUPAC 2021 abridged atomic weights
OURS = """
[[acid]]
name = "acid of the site"
charge = 0
[[acid.step]]
pka = 4.656
u = 0.02
source = "site method 12, invented"

[[substance]]
name = "acid of the site"
formula = "C5H8O3"
acid = "acid of the site"
source = "site method 12, invented"
"""


@pytest.fixture
def here(run: Run, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """The folder in which `run` runs, with the file in it and the user's configuration beside."""
    monkeypatch.setenv("RECONCILE_CONFIG", str(tmp_path / "configuration"))
    (tmp_path / "ours.toml").write_text(OURS, encoding="utf-8")
    return tmp_path


def record(folder: Path) -> None:
    """Four dilutions, half neutralised, each read once on each of three meters."""
    readings, recipes = ["Batch,Meter,Temperature (°C),pH"], ["Batch,Substance,Lot,Amount,Unit"]
    for i, millimolar in enumerate((20, 40, 60, 80)):
        recipes += [f"B{i},acid of the site,S-1,{millimolar},mM", f"B{i},sodium hydroxide,N-1,{millimolar / 2},mM"]
        # half neutralised: pKa less the Debye-Hückel term 0.509 sqrt I / (1 + 1.5 sqrt I) (Bates and Guggenheim 1960)
        root = (millimolar / 2000.0) ** 0.5
        ph = 4.656 - 0.509 * root / (1.0 + 1.5 * root)
        readings += [f"B{i},M{k},25.0,{ph + 0.01 * (k - 1):.2f}" for k in range(3)]
    (folder / "readings.csv").write_text("\n".join(readings) + "\n", encoding="utf-8")
    (folder / "recipes.csv").write_text("\n".join(recipes) + "\n", encoding="utf-8")


FILES = ("readings.csv", "recipes.csv")


def test_add_and_look(run: Run, here: Path) -> None:
    done = run("substances", "--add", "ours.toml")
    assert (done.code, done.err) == (0, "")
    assert "acid of the site" in done.out
    assert str(here / "configuration") in done.out
    entry = json.loads(run("substances", "acid of the site", "--json").out)["substances"][0]
    assert [c["pKa"] for c in entry["constants"]] == [4.656]
    assert entry["source"] == "site method 12, invented"
    assert "site method 12, invented" in run("substances", "acid of the site").out


def test_predict_knows_it(run: Run, here: Path) -> None:
    part = "0.1 M acid of the site"
    assert run("predict", part).code == 1
    run("substances", "--add", "ours.toml", "--json")
    own = json.loads(run("predict", part, "0.05 M sodium hydroxide", "--json").out)
    acetic = json.loads(run("predict", "0.1 M acetic acid", "0.05 M sodium hydroxide", "--json").out)
    assert acetic["pH"] - own["pH"] == pytest.approx(0.1, abs=0.002)
    assert "site method 12" in run("predict", part, "--trail").out


@pytest.mark.parametrize("beside", [False, True])
def test_a_report_names_the_file(beside: bool, run: Run, here: Path) -> None:
    record(here)
    assert run("audit", *FILES, "--out", "before").code == 4  # every row is set aside: the substance is unknown
    kept = json.loads(run("substances", "--add", "ours.toml", *(["--beside", "."] if beside else []), "--json").out)
    assert kept["substances"] == ["acid of the site"]
    assert run("audit", *FILES, "--out", "report").code == 0
    manifest = json.loads((here / "report" / "manifest.json").read_text(encoding="utf-8"))
    assert manifest["own_substances"] == [
        {
            "name": "substances.toml" if beside else "ours.toml",
            "sha256": hashlib.sha256(OURS.encode()).hexdigest(),
            "where": "beside the record" if beside else "configuration",
        }
    ]
    (here / "ours.toml").write_text(OURS.replace("4.656", "4.70"), encoding="utf-8")
    run("substances", "--add", "ours.toml", "--replace", *(["--beside", "."] if beside else []))
    assert run("audit", *FILES, "--out", "again").code == 0
    again = json.loads((here / "again" / "manifest.json").read_text(encoding="utf-8"))
    assert again["report_id"] != manifest["report_id"]


def test_a_record_without_any_says_so(run: Run, here: Path) -> None:
    record(here)
    text = (here / "recipes.csv").read_text(encoding="utf-8").replace("acid of the site", "acetic acid")
    (here / "recipes.csv").write_text(text, encoding="utf-8")
    assert run("audit", *FILES, "--out", "report").code == 0
    assert json.loads((here / "report" / "manifest.json").read_text(encoding="utf-8"))["own_substances"] == []


@pytest.mark.parametrize("beside", [False, True])
def test_pka_knows_it(beside: bool, run: Run, here: Path) -> None:
    record(here)
    run("substances", "--add", "ours.toml", *(["--beside", "."] if beside else []))
    done = run("pka", *FILES, "--acid", "acid of the site", "--out", "fit", "--json")
    assert done.code == 0, done.err
    fit = json.loads((here / "fit" / "pka.json").read_text(encoding="utf-8"))
    assert fit["steps"][0]["pKa_thermodynamic"] == pytest.approx(4.656, abs=0.02)


def test_what_is_wrong_is_a_message(run: Run, here: Path) -> None:
    (here / "ours.toml").write_text(OURS.replace("pka = 4.656", "pka = 46.56"), encoding="utf-8")
    done = run("substances", "--add", "ours.toml")
    assert (done.code, done.out) == (1, "")
    assert done.err.startswith("ours.toml: pka of step 1 of acid of the site")
    assert '"46.56"' in done.err
    assert "from -5 to 20" in done.err
    assert not (here / "configuration").exists()


def test_a_kept_copy_is_not_replaced_unasked(run: Run, here: Path) -> None:
    run("substances", "--add", "ours.toml")
    (here / "ours.toml").write_text(OURS.replace("4.656", "4.70"), encoding="utf-8")
    done = run("substances", "--add", "ours.toml")
    assert done.code == 2
    assert "--replace" in done.err


@pytest.mark.parametrize(
    "words", [("--replace",), ("--beside", "."), ("acetic acid", "--add", "ours.toml"), ("--add", "none.toml")]
)
def test_wrong_usage(words: tuple[str, ...], run: Run, here: Path) -> None:
    done = run("substances", *words)
    assert done.code == (1 if "none.toml" in words else 2)
    assert done.err


def test_a_folder_that_is_not_there(run: Run, here: Path) -> None:
    done = run("substances", "--add", "ours.toml", "--beside", "nowhere")
    assert done.code == 1
    assert "nowhere" in done.err
