"""Variance components of the auditor's model against another program's restricted maximum likelihood on the same data.

The design is one that both can express: readings of known solutions on several meters, each meter's level free, a
variance between calibration sessions and one of the readings. All other spreads are set to nothing.
"""

from __future__ import annotations

import warnings
from dataclasses import replace
from datetime import datetime, timedelta

import numpy as np
import pandas as pd
import pytest
import statsmodels.formula.api as smf
from builders import records_from_rows

from reconcile.auditor.layout import Layout, build_layout, one_hot
from reconcile.auditor.mixed import estimate
from reconcile.pipeline import predict_records
from reconcile.records.settings import Settings

HEAD = ("Read at", "Known solution", "Meter", "Temperature (°C)", "pH")
SETTINGS = Settings.from_sections(
    {"uncertainty": {"noise_floor": 1e-4, "session": 0.0, "meter_span_percent": 0.0, "temperature_k": 0.0}}
)
READINGS = 3


def layout_of(meters: int, sessions: int) -> Layout:
    """The layout of a balanced record; its residuals are replaced later."""
    start, rows = datetime(2025, 3, 3, 9), [HEAD]
    for m in range(meters):
        for s in range(sessions):
            for i in range(READINGS):
                rows.append((start + timedelta(days=s, minutes=10 * i), "phosphate", f"M-{m:02d}", 25.0, 6.86))
    records = records_from_rows(rows, settings=SETTINGS)
    prediction = predict_records(records, SETTINGS)
    layout = build_layout(records, prediction, SETTINGS, np.ones(len(records.readings), bool))
    nothing = np.zeros(len(layout))
    return replace(layout, other=nothing, shared=nothing, preparation=nothing)


@pytest.fixture(scope="module")
def short() -> Layout:
    """360 readings; a meter has 18, under the 20 from which the auditor gives it a noise of its own."""
    return layout_of(20, 6)


@pytest.fixture(scope="module")
def long() -> Layout:
    """1,440 readings, which is beyond the length up to which the auditor writes the whole covariance out."""
    return layout_of(10, 48)


def both(layout: Layout, seed: int, session_sd: float, noise_sd: float = 0.012) -> tuple[np.ndarray, np.ndarray]:
    """(noise sd, session sd) of the auditor, and of the other program, on one simulated record."""
    rng = np.random.default_rng(seed)
    r = rng.normal(0, noise_sd, len(layout)) + rng.normal(0, session_sd, layout.session.max() + 1)[layout.session]
    fixed = one_hot(layout.meter, len(layout.meters))
    ours = estimate(layout, SETTINGS, fixed=fixed, r=r)
    frame = pd.DataFrame({"r": r, "meter": layout.meter.astype(str), "session": layout.session})
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        fit = smf.mixedlm("r ~ 0 + meter", frame, groups="session").fit(reml=True)
    theirs = np.sqrt([fit.scale, float(np.asarray(fit.cov_re)[0, 0])])
    return np.sqrt([ours.noise * ours.meter_ratio.mean(), ours.session]), theirs


@pytest.mark.parametrize("seed", range(4))
@pytest.mark.parametrize("session_sd", [0.012, 0.03])
def test_components_agree_on_a_short_record(short: Layout, seed: int, session_sd: float) -> None:
    """360 normal readings. The auditor bounds scores at 2.5 standard deviations (Huber), which leaves out what the few
    largest of 360 readings and 120 sessions say: up to some percent of a standard deviation on one record."""
    ours, theirs = both(short, seed, session_sd)
    assert ours[0] == pytest.approx(theirs[0], rel=0.04)
    assert ours[1] == pytest.approx(theirs[1], rel=0.08)


def test_components_agree_on_a_long_record(long: Layout) -> None:
    """The bounded scores average out further; meters have noise of their own here, whose mean is compared. The blocks
    of a long record treat the levels of the meters as taking the same share of every reading, which is not exact."""
    ours, theirs = both(long, 9, 0.02)
    assert ours[0] == pytest.approx(theirs[0], rel=0.03)
    assert ours[1] == pytest.approx(theirs[1], rel=0.05)


def test_no_variance_between_sessions_is_found_where_there_is_none(short: Layout) -> None:
    ours, theirs = both(short, 5, 0.0)
    assert ours[1] < 0.004
    assert theirs[1] < 0.004
