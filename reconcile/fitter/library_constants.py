"""Constants of the library at temperature: value, standard uncertainty, enthalpy and heat capacity of ionization."""

from __future__ import annotations

import numpy as np

from reconcile.chemistry.acids import AcidTable
from reconcile.chemistry.temperature import GAS_CONSTANT, LN10, spread_between
from reconcile.chemistry.water import ZERO_CELSIUS
from reconcile.records.arrays import FloatArray, IntArray

STEP_K = 1.0
"""Step of the differences that give enthalpy and heat capacity [K]: pKa(T) is smooth, whatever its equation."""


def u_constant(acids: AcidTable, constant: IntArray, temperature_c: FloatArray) -> FloatArray:
    """Standard uncertainty of some constants, each at its temperature [°C], as the engine reckons it."""
    kelvin = temperature_c + ZERO_CELSIUS
    reference = np.clip(kelvin, acids.laws.low_k[constant], acids.laws.high_k[constant])
    by_dh, by_dcp = spread_between(kelvin, reference)
    u2 = acids.u[constant] ** 2 + (by_dh * acids.u_dh[constant]) ** 2 + (by_dcp * acids.u_dcp[constant]) ** 2
    return np.asarray(np.sqrt(u2))


def heats(acids: AcidTable, constant: IntArray, temperature_c: float) -> tuple[FloatArray, FloatArray]:
    """Enthalpy [kJ/mol] and heat capacity [J/(K mol)] of ionization at a temperature, from pKa(T) itself.

    Notes
    -----
    dH = -R ln 10 T^2 dpKa/dT and dCp = d(dH)/dT, by central differences.

    References
    ----------
    Robinson and Stokes, Electrolyte Solutions, 2nd ed. 1959, equations 12.19 and 12.20 (from memory).
    """

    def enthalpy(celsius: float) -> FloatArray:
        low, high = (acids.pka_at(constant, np.full(len(constant), celsius + d)) for d in (-STEP_K, STEP_K))
        kelvin = celsius + ZERO_CELSIUS
        return np.asarray(-GAS_CONSTANT * LN10 * kelvin**2 * (high - low) / (2.0 * STEP_K) / 1000.0)

    capacity = (enthalpy(temperature_c + STEP_K) - enthalpy(temperature_c - STEP_K)) / (2.0 * STEP_K) * 1000.0
    return enthalpy(temperature_c), np.asarray(capacity)
