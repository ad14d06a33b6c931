"""One predicted solution as terminal text and as JSON."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from reconcile.reporter.words import STATUS_MEANINGS, STATUSES, half_up, minus, significant

if TYPE_CHECKING:
    from reconcile.pipeline import PredictedParts
    from reconcile.records.substances import Form

PREDICTION_CAUTIONS = (
    "A prediction is a calculation, not a preparation instruction.",
    "Follow site procedure, safety data sheets, local rules and licensed practice.",
)
COVERAGE = 1.959963984540054  # standard normal quantile of 97.5 %
OK = "within the range of the activity model and of the glass electrode"


def interval95(predicted: PredictedParts) -> tuple[float, float]:
    """The 95 % interval of the predicted pH, from its standard uncertainty."""
    ph, u = float(predicted.prediction.ph[0]), float(predicted.prediction.u[0])
    return ph - COVERAGE * u, ph + COVERAGE * u


def shares(predicted: PredictedParts) -> Mapping[str, float]:
    """Percent of the variance by source, the largest first."""
    parts = {name: float(values[0]) ** 2 for name, values in predicted.prediction.budget.items()}
    whole = sum(parts.values())
    ordered = sorted(parts.items(), key=lambda item: (-item[1], item[0]))
    return {name: 100.0 * part / whole for name, part in ordered} if whole > 0 else {}


def degrees(predicted: PredictedParts) -> Mapping[str, float]:
    """Protons lost by each acid over those that it can lose."""
    degree = predicted.prediction.degree
    names = predicted.prediction.acid_names
    return {names[int(c)]: float(v) for c, v in zip(degree.column, degree.value, strict=True)}


def forms(predicted: PredictedParts) -> list[Form]:
    """The forms named, each once."""
    return list(dict.fromkeys(part.form for part in predicted.composition.parts))


def status_words(status: str) -> str:
    """A status with its meaning."""
    return OK if status == "ok" else f"{STATUSES[status]}: {STATUS_MEANINGS[status]}"


def show(predicted: PredictedParts) -> None:
    """The whole of it on standard output."""
    from reconcile.cli.show import columns, hazard_words, heading, line

    prediction, composition = predicted.prediction, predicted.composition
    low, high = interval95(predicted)
    ph, u = float(prediction.ph[0]), float(prediction.u[0])
    if prediction.status[0] == "not_solved":
        line("No pH was reached for this solution.", bold=True)
    else:
        line(
            f"pH {minus(half_up(ph, 3))}   u {significant(u, 2)}   "
            f"95 % interval {minus(half_up(low, 3))} to {minus(half_up(high, 3))}",
            bold=True,
        )
    model = predicted.settings["prediction.activity_model"]
    line(f"at {float(prediction.temperature_c[0]):g} °C; activity model {model}")
    line(f"{status_words(str(prediction.status[0]))}")
    if predicted.notices:
        heading("Notices")
        for notice in predicted.notices:
            line(f"  {notice.text}")
    heading(f"Made up to {composition.total}" if composition.total else "Parts")
    columns(
        [
            (part.text, f"{amount:.5g} {composition.unit}")
            for part, amount in zip(composition.parts, composition.amounts, strict=True)
        ]
    )
    heading("Solution")
    columns(
        [
            ("ionic strength", f"{significant(float(prediction.ionic_strength[0]), 4)} mol/kg"),
            ("buffer capacity", f"{significant(float(prediction.buffer_capacity[0]), 4)} mol/L per pH"),
            *((f"degree of ionization, {acid}", significant(value, 4)) for acid, value in degrees(predicted).items()),
        ]
    )
    heading("Shares of the uncertainty (percent of the variance)")
    columns([(name, half_up(share, 1)) for name, share in shares(predicted).items()], right=(1,))
    heading("Hazard words")
    columns([(form.name, hazard_words(form)) for form in forms(predicted)])
    notes = [(form.name, form.note) for form in forms(predicted) if form.note]
    if notes:
        heading("Notes")
        columns(notes)
    line()
    for caution in PREDICTION_CAUTIONS:
        line(caution)


def document(predicted: PredictedParts) -> dict[str, Any]:
    """All of it as --json prints it; a number that was not reached is null."""
    from reconcile.cli.show import hazard_words

    prediction, composition = predicted.prediction, predicted.composition
    return {
        "pH": prediction.ph[0],
        "u": prediction.u[0],
        "interval95": interval95(predicted),
        "status": str(prediction.status[0]),
        "status_meaning": status_words(str(prediction.status[0])),
        "temperature_C": prediction.temperature_c[0],
        "activity_model": predicted.settings["prediction.activity_model"],
        "made_up_to": composition.total or None,
        "parts": [
            {"text": part.text, "substance": part.form.name, "amount": amount, "unit": composition.unit}
            for part, amount in zip(composition.parts, composition.amounts, strict=True)
        ],
        "ionic_strength": {"value": prediction.ionic_strength[0], "unit": "mol/kg"},
        "buffer_capacity": {"value": prediction.buffer_capacity[0], "unit": "mol/L per pH"},
        "degree_of_ionization": degrees(predicted),
        "uncertainty_shares_percent": shares(predicted),
        "notices": [{"code": notice.code, "text": notice.text} for notice in predicted.notices],
        "hazards": [{"substance": form.name, "words": hazard_words(form)} for form in forms(predicted)],
        "notes": [{"substance": form.name, "note": form.note} for form in forms(predicted) if form.note],
        "cautions": list(PREDICTION_CAUTIONS),
    }
