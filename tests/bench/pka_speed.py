"""Speed of the fit, as ratios measured in one run: fifty series of twenty points in one call against fifty scalar fits.

The scalar fit is what one would write in plain Python: for every reading the charge balance with Davies' equation is
closed by a bracketing root finder around an iteration of the ionic strength, inside a general least-squares routine.
"""

from __future__ import annotations

import statistics
import sys
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
from scipy.optimize import brentq, least_squares

from reconcile.fitter.fitting import fit

sys.path.insert(0, str(Path(__file__).parents[1] / "fitter"))
from simulated_fits import Simulated, fit_of, simulated

SERIES, READINGS, TURNS = 50, 20, 3
A, PKW = 0.5091, 13.995
"""Debye-Hückel slope and pKw at 25 °C (Robinson and Stokes 1959; IAPWS R11-07, rounded)."""


def scalar_ph(pka: list[float], acid: float, base: float) -> float:
    """pH of one mixture [mol/kg] of a neutral acid and strong base."""
    strength = base + 1e-4
    ph = 7.0
    for _ in range(50):
        root = strength**0.5
        d = A * (root / (1.0 + root) - 0.3 * strength)

        def states(ph: float, d: float = d) -> list[float]:
            weights, lost = [1.0], 0.0
            for j, k in enumerate(pka):
                lost += ph - k + d * (2 * j + 1)
                weights.append(10.0**lost)
            whole = sum(weights)
            return [w / whole for w in weights]

        def charge(ph: float, d: float = d) -> float:
            anion = sum(j * share for j, share in enumerate(states(ph)))
            return base + 10.0 ** (d - ph) - 10.0 ** (ph - PKW + d) - acid * anion

        ph = brentq(charge, 0.0, 14.0, xtol=1e-10)
        square = sum(j * j * share for j, share in enumerate(states(ph)))
        found = 0.5 * (base + 10.0 ** (d - ph) + 10.0 ** (ph - PKW + d) + acid * square)
        if abs(found - strength) < 1e-10:
            break
        strength = found
    return float(ph)


def scalar_fits(made: Simulated, steps: int, strength: bool) -> list[list[float]]:
    """Every series fitted by itself."""
    cases = made.task.cases
    amounts = cases.amount[: 2 * READINGS].reshape(READINGS, 2).tolist()
    observed = made.task.observed.reshape(SERIES, READINGS)
    out = []
    for series in observed:

        def residual(given: np.ndarray, series: np.ndarray = series) -> list[float]:  # type: ignore[type-arg]
            factor = float(np.exp(given[steps])) if strength else 1.0
            pka = [float(p) for p in given[:steps]]
            return [y - scalar_ph(pka, a * factor, b) for y, (a, b) in zip(series.tolist(), amounts, strict=True)]

        start = made.truth[made.free] + 0.2 * (made.free < steps)
        out.append(least_squares(residual, start, method="lm").x.tolist())
    return out


def timed(work: Callable[[], object], turns: int) -> float:
    """Median time of some turns [s]."""
    times = []
    for _ in range(turns):
        begin = time.perf_counter()
        work()
        times.append(time.perf_counter() - begin)
    return statistics.median(times)


def main() -> None:
    print(f"{SERIES} series of {READINGS} readings; times in seconds, medians of {TURNS} (scalar: 1)")
    print("one call: least squares, noise and covariance; tested: the same with the test for readings to reject")
    print(f"{'steps':>5} {'strength':>9} {'one call':>9} {'tested':>9} {'scalar':>9} {'ratio':>8}   apart (pKa)")
    for steps in (1, 2):
        for strength in (False, True):
            made = simulated(steps, strength, SERIES, READINGS, seed=300 + steps)
            fit_of(made)  # loads what is loaded once
            ours = timed(lambda made=made: fit(made.task), TURNS)  # type: ignore[misc]
            tested = timed(lambda made=made: fit_of(made), TURNS)  # type: ignore[misc]
            begin = time.perf_counter()
            scalar = np.array(scalar_fits(made, steps, strength))
            plain = time.perf_counter() - begin
            apart = np.abs(fit(made.task).theta[:, :steps] - scalar[:, :steps]).max()
            free = "free" if strength else "fixed"
            print(f"{steps:>5} {free:>9} {ours:>9.3f} {tested:>9.3f} {plain:>9.2f} {ours / plain:>8.4f}   {apart:.5f}")


if __name__ == "__main__":
    main()
