"""The doors of the room: pH of mixtures given as arrays, of the readings of a record, and of supposed changes to it."""

from __future__ import annotations

from collections.abc import Sequence
from importlib import import_module
from typing import TYPE_CHECKING, Any
from zlib import crc32

import numpy as np

from reconcile.chemistry.acids import AcidTable, acid_table
from reconcile.chemistry.activity import activity_model as model_named
from reconcile.chemistry.carbon_dioxide import CARBON_DIOXIDE, share_of_gas
from reconcile.chemistry.composition import Contents, form_table
from reconcile.chemistry.drawn import u_drawn
from reconcile.chemistry.engine import Ragged, run
from reconcile.chemistry.monte_carlo import Errors
from reconcile.chemistry.prediction import assemble, regrouped, triplets, u_of_model
from reconcile.chemistry.solve import rows_alike
from reconcile.chemistry.uncertainty import ROOT3, of_independent
from reconcile.chemistry.water import DENSITY_20C, co2_solubility
from reconcile.records.arrays import FloatArray
from reconcile.records.results import Prediction
from reconcile.records.settings import Settings
from reconcile.records.substances import Form, catalogue

if TYPE_CHECKING:
    from reconcile.chemistry.of_records import predict_records
    from reconcile.chemistry.repredict import repredictor

__all__ = ["dissolved_co2", "predict_ph", "predict_records", "repredictor"]
_LATE = {"predict_records": "of_records", "repredictor": "repredict"}


def __getattr__(name: str) -> Any:
    """What concerns records, loaded when first asked for: the prediction of one solution starts without it."""
    if name in _LATE:
        return getattr(import_module(f"reconcile.chemistry.{_LATE[name]}"), name)
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")


UNITS = ("mol/L", "mol/kg")


def dissolved_co2(temperature_c: FloatArray | float = 25.0, partial_pressure_atm: float = 4.2e-4) -> FloatArray:
    """Molality of dissolved carbon dioxide in water that stands open to air.

    Parameters
    ----------
    temperature_c : array_like (n,)
        Temperature [°C].
    partial_pressure_atm : float
        Partial pressure of carbon dioxide [atm].

    Returns
    -------
    ndarray (n,)
        Carbon dioxide and carbonic acid together [mol/kg], before any ionization.

    References
    ----------
    Weiss 1974, doi:10.1016/0304-4203(74)90015-2 (see water.co2_solubility).
    """
    return np.asarray(co2_solubility(np.asarray(temperature_c, float))[0] * partial_pressure_atm)


def forms_named(substances: Sequence[str | Form]) -> list[Form]:
    """Forms of the library by name, synonym or unambiguous formula; raises ValueError with near misses otherwise."""
    found = []
    for text in substances:
        if isinstance(text, Form):
            found.append(text)
            continue
        answer = catalogue().look_up(text)
        if answer.form is None:
            if answer.several:
                raise ValueError(
                    f"{text!r} may mean {' or '.join(f.name for f in answer.several)}: write the full name"
                )
            near = f"; did you mean {' or '.join(answer.near)}?" if answer.near else ""
            raise ValueError(f"no substance of the library is called {text!r}{near}")
        found.append(answer.form)
    return found


def _per_amount(given: Any, default: float, shape: tuple[int, int], name: str) -> FloatArray:
    try:
        return np.broadcast_to(np.asarray(default if given is None else given, float), shape)
    except ValueError:
        raise ValueError(f"{name} must be one number, {shape[1]} numbers, or an array {shape}") from None


def predict_ph(
    substances: Sequence[str | Form],
    amounts: Any,
    temperature_c: Any = 25.0,
    *,
    unit: str = "mol/L",
    activity_model: str | None = None,
    settings: Settings | None = None,
    u_amounts: Any = None,
    u_temperature: Any = None,
    acids: AcidTable | None = None,
) -> Prediction:
    """pH of n mixtures of k substances, by full charge balance with activity coefficients.

    Parameters
    ----------
    substances : sequence of str (k,)
        Names, synonyms or unambiguous formulas of the library; or Forms.
    amounts : array_like (n, k)
        Final concentration of each substance [mol/L of solution at 20 °C, or mol/kg of water]; a single row may be
        given as (k,). A row with NaN or a negative amount has status not_solved.
    temperature_c : float or array_like (n,)
        Temperature of the solution [°C]; NaN, or a value outside 0 to 100 °C, gives status not_solved.
    unit : {"mol/L", "mol/kg"}
        Unit of the amounts; mol/L is turned into mol/kg with the density of water at 20 °C.
    activity_model : str, optional
        A name of ACTIVITY_MODELS; by default that of the settings.
    settings : Settings, optional
        Defaults, statuses and uncertainties.
    u_amounts : array_like, optional
        Relative standard uncertainty of the amounts [-], one, (k,) or (n, k). By default the settings' half-widths for
        the strength of a lot and for preparation, each substance independent.
    u_temperature : array_like, optional
        Standard uncertainty of temperature [K], one or (n,).
    acids : AcidTable, optional
        Ionization constants and ion pairs; by default the tables of the package, as the settings have it.

    Returns
    -------
    Prediction
        Arrays (n,); the columns of `contributions` are the k substances.

    Raises
    ------
    ValueError
        For a substance, unit or activity model that does not exist, or shapes that do not fit.

    Notes
    -----
    pH is -lg of the hydrogen-ion activity. Apparent constants follow from the thermodynamic ones through the activity
    coefficient of every charge state. Valid for 0 to 100 °C (constants mostly 0 to 60 °C) and up to the ionic strength
    of the activity model; beyond it the prediction comes with status outside_model and a larger uncertainty.

    References
    ----------
    Davies 1962; IAPWS SR6-08 and R11-07; acids.csv for the source of every constant; JCGM 100:2008.
    """
    settings = settings or Settings()
    forms = forms_named(substances)
    k = len(forms)
    table = np.asarray(amounts, float)
    if table.ndim == 1:
        table = table[None, :]
    if table.ndim != 2 or table.shape[1] != k:
        raise ValueError(f"amounts must have one column for each of the {k} substances, (n, {k}); got {table.shape}")
    n = len(table)
    if unit not in UNITS:
        raise ValueError(f"no unit of amounts is called {unit!r}; there are: {', '.join(UNITS)}")
    model = model_named(activity_model or settings["prediction.activity_model"])
    acids = acids or acid_table(settings["prediction.pk_equations"], settings["prediction.ion_pairs"])
    temperature = _per_row(temperature_c, n, "temperature_c")
    with np.errstate(invalid="ignore"):
        bad = ~np.all(np.isfinite(table) & (table >= 0.0), axis=1)

    first, which = rows_alike(np.column_stack([table, temperature, bad]))
    distinct = np.where(bad[first, None], 0.0, table[first])
    row, column = np.nonzero(distinct)
    start = np.concatenate([[0], np.cumsum(np.bincount(row, minlength=len(first)))]).astype(np.intp)
    at = np.where(bad[first], np.nan, temperature[first])
    scale = 1.0 if unit == "mol/kg" else 1.0 / DENSITY_20C
    air = np.zeros(len(first))
    if settings["prediction.open_to_air"]:
        air = np.nan_to_num(dissolved_co2(at, settings["prediction.co2_partial_pressure_atm"]))
    contents = Contents(start, column, distinct[row, column] * scale, at, air)
    table_of_forms = form_table([*forms, CARBON_DIOXIDE], acids)
    answers = run(contents, table_of_forms, acids, model)

    part = regrouped(Ragged(start, column, answers.entry), which)
    contributions = triplets(part, k)
    taking = settings["uncertainty.preparation_percent"] / 100.0 / ROOT3 if u_amounts is None else 0.0
    strength = _per_amount(u_amounts, settings["uncertainty.lot_strength_percent"] / 100.0 / ROOT3, (n, k), "u_amounts")
    cells = contributions.row, contributions.column
    shares = {
        "strength": of_independent(part.start, part.value, strength[cells]),
        "taking": of_independent(part.start, part.value, np.array(taking)),
    }
    u_t = settings["uncertainty.temperature_k"] / ROOT3 if u_temperature is None else u_temperature
    u_rows = _per_row(u_t, n, "u_temperature")
    own = np.array([crc32(form.name.encode()) for form in forms], np.intp)[column]  # whatever the order of substances
    errors = Errors(
        np.tile(np.arange(len(row)), 2),
        np.concatenate([2 * own, 2 * own + 1]),
        np.concatenate([strength[first[row], column], np.full(len(row), taking)]),
        u_rows[first],
        u_of_model(model, settings),
    )
    amounts_share = np.hypot(shares["strength"], shares["taking"])[first]
    drawn = u_drawn(contents, table_of_forms, acids, model, errors, answers, amounts_share)
    gas = share_of_gas(contents, table_of_forms, acids, model, settings, answers, k)
    return assemble(answers, at, which, u_rows, shares, contributions, acids, model, settings, gas, drawn)


def _per_row(given: Any, n: int, name: str) -> FloatArray:
    try:
        return np.array(np.broadcast_to(np.asarray(given, float), (n,)))
    except ValueError:
        raise ValueError(f"{name} must be one number or {n} numbers, one for each row of amounts") from None
