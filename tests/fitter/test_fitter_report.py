"""The report folder and the command: what is written, that it agrees with itself, and the exit codes."""

from __future__ import annotations

import csv
import hashlib
import io
import json
import re
from pathlib import Path

import numpy as np
import openpyxl
import pytest
from made_records import Made, Truth
from typer.testing import CliRunner, Result

import reconcile
from reconcile.cli.app import app
from reconcile.records.pka_results import PkaFit
from reconcile.reporter.cautions import CAUTIONS
from reconcile.reporter.figures.pka_fit import abscissa, pka_fit
from reconcile.reporter.figures.pka_profile import pka_profile
from reconcile.reporter.figures.pka_species import pka_species
from reconcile.reporter.figures.style import styled
from reconcile.reporter.pka_json import pka_document

NAME = "acid K"
STEP = {"pKa_thermodynamic", "u", "interval95", "pKa_apparent", "ionic_strength", "temperature_C"}
DOCUMENT = [
    "acid", "steps", "strength_factor", "meter_offset", "identifiable", "candidates", "readings_used", "conclusion",
]  # fmt: skip


def made(seed: int = 21) -> Made:
    """Two series of a diprotic acid, one reading spoilt, one row without a recipe."""
    two = Truth("succinic acid")
    out = Made(seed).titration(two, NAME, "T1", added=range(2, 50, 3)).titration(two, NAME, "T2", added=range(3, 50, 5))
    row = list(out.readings[8])
    row[6] = round(row[6] + 0.25, 3)
    out.readings[8] = tuple(row)
    return out.reading(batch="B-99", meter="M-1", celsius=25.0, ph=4.5)


@pytest.fixture(scope="module")
def fit(tmp_path_factory: pytest.TempPathFactory) -> PkaFit:
    return reconcile.fit_pka(made().write(tmp_path_factory.mktemp("record")), acid=NAME)


@pytest.fixture(scope="module")
def report(fit: PkaFit, tmp_path_factory: pytest.TempPathFactory) -> Path:
    return reconcile.write_report(fit, tmp_path_factory.mktemp("out") / "report")


def run(folder: Path, *words: str) -> Result:
    with pytest.MonkeyPatch.context() as patch:
        patch.chdir(folder)
        patch.setenv("COLUMNS", "400")
        result = CliRunner().invoke(app, ["pka", *words])
    assert "Traceback" not in result.stdout + result.stderr
    return result


def test_pka_json_has_the_keys_that_are_agreed(report: Path) -> None:
    document = json.loads((report / "pka.json").read_text(encoding="utf-8"))
    assert list(document) == DOCUMENT
    assert len(document["steps"]) == 2
    assert all(set(step) >= STEP for step in document["steps"])
    assert all(set(step) <= STEP | {"pKa_25C", "dH_kJ_mol"} for step in document["steps"])
    assert set(document["identifiable"]) == {"pKa", "strength", "offset"}
    assert all(set(c) == {"acid", "log_likelihood_ratio"} for c in document["candidates"])
    ratios = [c["log_likelihood_ratio"] for c in document["candidates"]]
    assert ratios == sorted(ratios, reverse=True)


def test_the_folder_is_whole_and_its_manifest_knows_every_file(report: Path) -> None:
    names = {p.relative_to(report).as_posix() for p in report.rglob("*") if p.is_file()}
    pictures = {f"plots/{name}.{kind}" for name in ("fit", "profile", "species") for kind in ("png", "svg")}
    tables = {f"{n}.csv" for n in ("readings", "steps", "budget", "candidates", "series", "numbers", "set_aside")}
    assert names == {"pka.json", "pka.xlsx", "report.html", "manifest.json", *pictures, *tables}
    manifest = json.loads((report / "manifest.json").read_text(encoding="utf-8"))
    for output in manifest["outputs"]:
        assert hashlib.sha256((report / output["name"]).read_bytes()).hexdigest() == output["sha256"]
    assert {o["name"] for o in manifest["outputs"]} == names - {"manifest.json"}
    assert manifest["command"] == "pka --acid 'acid K'"


def test_the_same_input_gives_the_same_bytes(fit: PkaFit, report: Path, tmp_path: Path) -> None:
    again = reconcile.write_report(
        reconcile.fit_pka(made().write(tmp_path), acid=NAME), tmp_path / "again", replace=False
    )
    # the workbook that openpyxl writes holds a clock, so that its own hash differs; nothing else of the fit may
    for name in ("readings.csv", "steps.csv", "budget.csv", "candidates.csv", "pka.json", "plots/fit.svg"):
        assert (again / name).read_bytes() == (report / name).read_bytes(), name
    twice = reconcile.write_report(fit, tmp_path / "twice")
    for path in sorted(report.rglob("*")):
        if path.is_file() and path.name != "manifest.json":
            assert (twice / path.relative_to(report)).read_bytes() == path.read_bytes(), path.name


def test_tables_agree_with_the_fit(fit: PkaFit, report: Path) -> None:
    rows = list(csv.DictReader(io.StringIO((report / "readings.csv").read_text(encoding="utf-8"))))
    assert len(rows) == len(fit.index)
    assert [r["status"] for r in rows] == fit.status.tolist()
    assert [float(r["residual"]) for r in rows] == pytest.approx(fit.residual.tolist(), rel=1e-5)
    book = openpyxl.load_workbook(report / "pka.xlsx")
    assert book.sheetnames[:2] == ["Steps", "Readings"]
    heading = [cell.value for cell in book["Steps"][1]]
    at = heading.index("pKa (I = 0)")
    assert [row[at].value for row in book["Steps"].iter_rows(min_row=2)] == pytest.approx(
        [step.pka for step in fit.steps], abs=1e-5
    )
    aside = list(csv.DictReader(io.StringIO((report / "set_aside.csv").read_text(encoding="utf-8"))))
    assert len(aside) == 1
    assert fit.rows["read"] == fit.rows["used"] + fit.rows["set_aside"]


def test_the_page_says_what_the_fit_says(fit: PkaFit, report: Path) -> None:
    page = (report / "report.html").read_text(encoding="utf-8")
    assert "Ionization constants of acid K" in page
    assert "Reviewer’s conclusion" in page
    assert "no hazard word recorded here; see the safety data sheet" in page
    assert "rejected by a test at a family-wise 1 %" in re.sub(r"</?span[^>]*>", "", page)
    for caution in CAUTIONS:
        assert caution.split(",")[0].split("'")[0] in page
    assert "<script src" not in page
    assert "http" not in page.split("</style>")[1].replace("https://doi", "")


def test_the_fit_picture_shows_every_reading_and_the_curve(fit: PkaFit) -> None:
    with styled():
        top, low = pka_fit(fit).axes
    kind, x = abscissa(fit)
    assert kind == "base_per_acid"
    shown = sum(len(points.get_offsets()) for points in top.collections)
    assert shown == len(fit.index)
    used = fit.status == "used"
    for line in fit.curves:
        mine = used & (np.asarray(fit.records.readings["series"], object)[fit.index] == line.label)
        assert np.interp(x[mine], line.x, line.y) == pytest.approx(fit.fitted[mine], abs=2e-3)
    assert low.get_xlabel() == "strong base per acid (mol/mol; negative: strong acid)"


def test_the_profile_crosses_its_reach_at_the_interval(fit: PkaFit) -> None:
    for line, step in zip(fit.profiles, fit.steps, strict=True):
        assert line.y.min() == pytest.approx(0.0, abs=1e-6)
        for end in step.interval95 or ():
            assert np.interp(end, line.x, line.y) == pytest.approx(fit.reach95, rel=0.02)
    with styled():
        assert len(pka_profile(fit).axes) == 2


def test_species_sum_to_one_and_readings_are_ticks_on_the_axis(fit: PkaFit) -> None:
    assert np.sum([line.y for line in fit.species], axis=0) == pytest.approx(1.0)
    assert [line.label for line in fit.species] == ["0", "-1", "-2"]
    with styled():
        axes = pka_species(fit).axes[0]
    ticks = sum(len(lines.get_segments()) for lines in axes.collections)
    assert ticks == len(fit.index)


def test_frames_for_a_notebook(fit: PkaFit) -> None:
    assert list(fit.readings["status"]) == fit.status.tolist()
    assert fit.candidates_table.iloc[0]["acid"] == "succinic acid"


# ---- the command -----------------------------------------------------------------------------------------------------


def test_the_command_writes_a_folder_and_prints_its_gist(tmp_path: Path) -> None:
    made().write(tmp_path)
    done = run(tmp_path, "record.xlsx", "--acid", NAME)
    assert done.exit_code == 0
    assert (tmp_path / "reports" / "record_pka" / "pka.json").exists()
    assert "What was found" in done.stdout
    assert "acid K            no hazard word recorded here; see the safety data sheet" in done.stdout
    again = run(tmp_path, "record.xlsx", "--acid", NAME)
    assert again.exit_code == 2
    assert "already holds a report" in again.stderr
    assert run(tmp_path, "record.xlsx", "--acid", NAME, "--replace").exit_code == 0


def test_json_is_the_document_and_nothing_else(tmp_path: Path) -> None:
    made().write(tmp_path)
    done = run(tmp_path, "record.xlsx", "--acid", NAME, "--json", "--free", "strength", "--steps", "2", "--quiet")
    document = json.loads(done.stdout)
    assert list(document)[: len(DOCUMENT)] == DOCUMENT
    assert document["strength_factor"] is not None
    assert document["rows"]["read"] == document["rows"]["used"] + document["rows"]["set_aside"]
    assert done.stderr == ""


@pytest.mark.parametrize(
    ("words", "code", "said"),
    [
        (("record.xlsx", "--acid", NAME, "--strict"), 3, ""),  # a reading was rejected
        (("record.xlsx", "--acid", "acid Q"), 1, "no reading is of a solution that holds"),
        (("record.xlsx", "--acid", NAME, "--charge", "1"), 1, "no counter-ion is named"),
        (("absent.xlsx", "--acid", NAME), 1, "there is no such file"),
        (("record.xlsx",), 2, "--acid"),
        (("record.xlsx", "--acid", NAME, "--steps", "two"), 2, "--steps"),
    ],
)
def test_exit_codes(tmp_path: Path, words: tuple[str, ...], code: int, said: str) -> None:
    made().write(tmp_path)
    before = set(tmp_path.rglob("*"))
    done = run(tmp_path, *words)
    assert done.exit_code == code
    assert said in done.stderr
    if code in (1, 2):
        assert set(tmp_path.rglob("*")) == before
    if code == 1:
        assert "Nothing was written" in done.stderr


def test_an_incomplete_record_outranks_a_flag(tmp_path: Path) -> None:
    out = made()
    for i in range(4):
        out.reading(batch=f"X-{i}", meter="M-1", celsius=25.0, ph=5.0)
    out.write(tmp_path)
    assert run(tmp_path, "record.xlsx", "--acid", NAME, "--strict").exit_code == 4


def test_text_of_the_record_is_made_harmless(tmp_path: Path) -> None:
    name = "-acid<b>"
    book = Made(3).titration(Truth(), name).write(tmp_path)
    report = reconcile.write_report(reconcile.fit_pka(book, acid=name, steps=1), tmp_path / "out")
    assert "<b>" not in (report / "report.html").read_text(encoding="utf-8")
    assert json.loads((report / "pka.json").read_text(encoding="utf-8"))["acid"] == name


def test_numbers_that_are_not_identifiable_are_null(tmp_path: Path) -> None:
    rows = [(c, 0.0) for c in (0.1, 0.05, 0.02, 0.01, 0.005)]
    book = Made(4).solutions(Truth(), NAME, rows).write(tmp_path)
    fit = reconcile.fit_pka(book, acid=NAME, steps=1, free=("strength",))
    reconcile.write_report(fit, tmp_path / "out")
    document = pka_document(fit)
    assert document["steps"][0] == {
        "pKa_thermodynamic": None, "u": None, "interval95": None, "pKa_apparent": None, "ionic_strength": None,
        "temperature_C": 25.0,
    }  # fmt: skip
