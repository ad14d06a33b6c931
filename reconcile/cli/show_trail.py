"""The calculation behind a prediction as terminal text and as JSON: a record for a reviewer."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from reconcile.cli.show import columns, heading, line
from reconcile.reporter.words import half_up, minus, significant

if TYPE_CHECKING:
    from reconcile.pipeline import PredictedParts, Trail

WATER_SOURCES = (
    ("density at 20 °C", "IAPWS SR6-08(2011)"),
    ("pKw", "IAPWS R11-07(2019)"),
    ("A, B", "from density and permittivity, IAPWS SR6-08(2011), and constants of CODATA 2018"),
)
LEAST = 1e-12  # mol/kg, of a species that the text still lists; JSON lists all


def _signed(value: float, decimals: int) -> str:
    text = half_up(value, decimals)
    return minus(text if text.startswith("-") else f"+{text}")


def show(trail: Trail, predicted: PredictedParts) -> None:
    """The calculation record on standard output."""
    prediction, composition = predicted.prediction, predicted.composition
    heading("Calculation record")
    line("Amounts: from what was given to molality, and what each part brings", indent=2)
    columns(
        [
            (part.text, f"{amount:.6g} {composition.unit}", f"{b.molality:.6g} mol/kg", b.brings)
            for part, amount, b in zip(composition.parts, composition.amounts, trail.brought, strict=True)
        ],
        headings=("part", "made up", "molality", "one formula unit brings"),
    )
    if composition.unit != "mol/kg":
        line(f"mol/L over the density of water at 20 °C, {trail.density_20c:.6f} kg/L, gives mol/kg.", indent=2)
    heading("Water")
    values = (f"{trail.density_20c:.6f} kg/L", f"{trail.pkw:.4f}", f"{trail.a:.5f}, {trail.b:.5f} per Å, (kg/mol)^½")
    columns([(name, value, source) for (name, source), value in zip(WATER_SOURCES, values, strict=True)])
    if trail.constants:
        heading("Ionization constants (25 °C and I = 0; at the temperature; as each acts in this solution)")
        columns(
            [
                (
                    f"{c.acid} {c.step}",
                    half_up(c.pka_25c, 3),
                    half_up(c.pka, 4),
                    significant(c.u, 2),
                    half_up(c.acting, 4),
                    c.how,
                    c.source,
                )
                for c in trail.constants
            ],
            headings=("step", "pKa 25 °C", "pKa", "u", "acts as", "with temperature by", "source"),
            right=(1, 2, 3, 4),
        )
    if trail.pairs:
        heading("Ion pairs and condensed species (I = 0, at the temperature)")
        columns(
            [(p.name, half_up(p.lg_k, 3), significant(p.u, 2), p.source) for p in trail.pairs],
            headings=("species", "lg K", "u", "source"),
            right=(1, 2),
        )
    heading("Activity coefficients")
    name, source, uncertain = trail.model
    columns([("model", name), ("source", source), ("uncertain in it", uncertain)])
    heading(
        f"Species at pH {minus(half_up(trail.ph, 4))}, ionic strength {significant(trail.ionic_strength, 5)} mol/kg"
    )
    columns(
        [
            (s.name, f"{s.molality:.4e}", _signed(s.lg_gamma, 4), f"{s.molality * 10.0**s.lg_gamma:.4e}")
            for s in trail.species
            if s.molality >= LEAST
        ],
        headings=("species", "mol/kg", "lg γ", "activity"),
        right=(1, 2, 3),
    )
    line(f"Sum of charges: {minus(f'{trail.charge:.1e}')} mol/kg.", indent=2)
    heading("Uncertainty")
    columns(
        [(name, f"{float(values[0]):.4f} pH") for name, values in prediction.budget.items()]
        + [("together", f"{float(prediction.u[0]):.4f} pH")]
    )
    slopes = prediction.contributions.dense()[0]
    columns(
        [
            (f"pH per 1 % of {part.text}", _signed(0.01 * float(slope), 5))
            for part, slope in zip(composition.parts, slopes, strict=True)
        ]
    )
    constants = prediction.constants.dense()[0]
    columns(
        [
            (f"pH per 0.01 of pKa {acid} {step}", _signed(0.01 * float(slope), 5))
            for (acid, step), slope in zip(prediction.constant_names, constants, strict=True)
        ]
    )
    heading("Hand methods, none of them used here")
    columns(
        [
            (h.method, half_up(h.value, 3) if h.applies else "–", _signed(h.difference, 3) if h.applies else "", h.why)
            for h in trail.hand
        ],
        headings=("method", "pH", "difference", "why"),
        right=(1, 2),
    )


def document(trail: Trail) -> Mapping[str, Any]:
    """All of it as --json prints it."""
    return {
        "brought": [{"substance": b.name, "mol_per_kg": b.molality, "brings": b.brings} for b in trail.brought],
        "water": {
            "density_20C_kg_L": trail.density_20c,
            "pKw": trail.pkw,
            "A": trail.a,
            "B_per_angstrom": trail.b,
            "sources": dict(WATER_SOURCES),
        },
        "activity_model": dict(zip(("name", "source", "uncertain"), trail.model, strict=True)),
        "constants": [
            {
                "acid": c.acid,
                "step": c.step,
                "pKa_25C": c.pka_25c,
                "u_25C": c.u_25c,
                "pKa": c.pka,
                "u": c.u,
                "acts_as": c.acting,
                "with_temperature_by": c.how,
                "source": c.source,
            }
            for c in trail.constants
        ],
        "ion_pairs": [{"species": p.name, "lg_K": p.lg_k, "u": p.u, "source": p.source} for p in trail.pairs],
        "species": [
            {"species": s.name, "charge": s.charge, "mol_per_kg": s.molality, "lg_gamma": s.lg_gamma}
            for s in trail.species
        ],
        "sum_of_charges_mol_per_kg": trail.charge,
        "hand_methods": [
            {"method": h.method, "pH": h.value, "difference": h.difference, "why": h.why} for h in trail.hand
        ],
    }
