"""An independent solution of one mixture with 50 digits: nothing of the engine but the numbers of its tables."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from mpmath import mp, mpf

mp.dps = 50


@dataclass(frozen=True)
class Acid:
    """Charge of the fully protonated form, pKa at the temperature, molality, and ion sizes of its states."""

    charge: int
    pka: Sequence[float]
    molality: float
    sizes: Sequence[float]


def exponent(model: str, a: float, b: float, strength: mpf, size: float) -> mpf:
    """-lg gamma of an ion of charge 1: the equations of Davies, of Bates and Guggenheim, of Kielland."""
    root = mp.sqrt(strength)
    if model == "ideal":
        return mpf(0)
    if model == "davies":
        return mpf(a) * (root / (1 + root) - mpf(3) / 10 * min(strength, mpf(1) / 2))
    if model == "bates-guggenheim":
        return mpf(a) * root / (1 + mpf(3) / 2 * root)
    return mpf(a) * root / (1 + mpf(b) * mpf(size) * root)


def gamma(model: str, a: float, b: float, strength: mpf, charge: int, size: float) -> mpf:
    return mpf(10) ** (-(charge**2) * exponent(model, a, b, strength, size))


def species(
    model: str,
    a: float,
    b: float,
    pkw: float,
    acids: Sequence[Acid],
    strong: Sequence[tuple[int, float]],
    ph: mpf,
    i: mpf,
) -> list[tuple[int, mpf]]:
    """Charge and molality of every species at a trial pH and ionic strength."""
    activity_h = mpf(10) ** -ph
    out = [(z, mpf(m)) for z, m in strong]
    out.append((1, activity_h / gamma(model, a, b, i, 1, 9.0)))
    out.append((-1, mpf(10) ** (ph - mpf(pkw)) / gamma(model, a, b, i, -1, 3.5)))
    for acid in acids:
        activities = [mpf(1)]
        for pka in acid.pka:
            activities.append(activities[-1] * mpf(10) ** -mpf(pka) / activity_h)
        charges = [acid.charge - j for j in range(len(activities))]
        relative = [
            x / gamma(model, a, b, i, z, size) for x, z, size in zip(activities, charges, acid.sizes, strict=True)
        ]
        whole = sum(relative)
        out.extend((z, mpf(acid.molality) * r / whole) for z, r in zip(charges, relative, strict=True))
    return out


def ph_of(
    model: str, a: float, b: float, pkw: float, acids: Sequence[Acid], strong: Sequence[tuple[int, float]]
) -> tuple[mpf, mpf]:
    """pH and ionic strength: a bracketed root of the charge, around which the ionic strength is iterated."""
    strength, around = mpf("0.01"), (mpf(-3), mpf(18))
    for _ in range(400):

        def charge(ph: mpf, i: mpf = strength) -> mpf:
            return sum(z * m for z, m in species(model, a, b, pkw, acids, strong, ph, i))

        low, high = around if charge(around[0]) > 0 > charge(around[1]) else (mpf(-3), mpf(18))
        while high - low > mpf("0.1"):
            middle = (low + high) / 2
            low, high = (middle, high) if charge(middle) > 0 else (low, middle)
        ph = mp.findroot(charge, (low, high), solver="anderson", tol=mpf(10) ** -40)
        around = (ph - mpf("0.02"), ph + mpf("0.02"))
        found = sum(z * z * m for z, m in species(model, a, b, pkw, acids, strong, ph, strength)) / 2
        if abs(found - strength) < mpf(10) ** -14 * strength:
            return ph, found
        strength = found
    raise AssertionError("the ionic strength did not settle")
