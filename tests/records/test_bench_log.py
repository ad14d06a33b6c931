"""The bench log of 400 rows imports, and every row lands where a person would put it."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from bench_log import ADJUSTED, AS_PREDICTED, ROWS, Log, bench_log, sheets_of
from worked import WAYS, read_as

import reconcile
from reconcile.chemistry.adjusted import with_adjustments
from reconcile.pipeline import predict_records
from reconcile.records.settings import Settings


@pytest.fixture(scope="module")
def log(tmp_path_factory: pytest.TempPathFactory) -> Log:
    """The log with its open pH cells filled: prediction and noise of 0.01, the later ones from the adjusted ones."""
    made, rng = bench_log(), np.random.default_rng(9)
    folder = tmp_path_factory.mktemp("log")
    waiting = [i for i, row in enumerate(made.readings) if row[8] is None]
    for i in waiting:
        made.readings[i][8] = 7.0
    first = [i for i in waiting if made.belongs[i] == AS_PREDICTED]
    records = with_adjustments(read_as("workbook", folder, sheets_of(made)), Settings())
    predicted = dict(zip(records.readings.row.tolist(), predict_records(records).ph.tolist(), strict=True))
    for i in first:
        made.readings[i][8] = round(predicted[i + 2] + rng.normal(0.0, 0.01), 2)
    return made


def test_the_log_has_four_hundred_rows_of_every_sort(log: Log) -> None:
    assert len(log.readings) == ROWS
    assert len(set(log.belongs)) == 13
    assert log.belongs.count(AS_PREDICTED) > 250
    assert log.belongs.count(ADJUSTED) == 24


@pytest.mark.parametrize("way", WAYS)
def test_every_row_lands_where_a_person_would_put_it(way: str, log: Log, tmp_path: Path) -> None:
    audit = reconcile.audit(read_as(way, tmp_path, sheets_of(log)))
    records = audit.records
    assert records.rows_read == ROWS == len(records.readings) + len(records.set_aside)
    landed = {int(row): str(status) for row, status in zip(records.readings.row, audit.status, strict=True)}
    landed |= {aside.place.row: aside.code for aside in records.set_aside}
    wrong = {
        row: (landed.get(row), belongs) for row, belongs in enumerate(log.belongs, 2) if landed.get(row) != belongs
    }
    assert wrong == {}
    assert [(f.kind, f.subject) for f in audit.findings] == []
    evidence = np.isin(audit.status, [AS_PREDICTED])
    assert audit.evidence.tolist() == evidence.tolist()
