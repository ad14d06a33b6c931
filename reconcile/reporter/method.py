"""How a report came about, in words: for the page and for the workbook's Method sheet."""

from __future__ import annotations

from reconcile import __version__
from reconcile.records.results import Audit
from reconcile.reporter.cautions import CAUTIONS, FORMULA_NOTE, ROUNDING_NOTE, UNSIGNED
from reconcile.reporter.manifest import constants, inputs, report_id
from reconcile.reporter.plain import plain
from reconcile.reporter.words import STATUS_MEANINGS, STATUSES, half_up

MODELS = {
    "davies": "the Davies equation",
    "extended": "the extended Debye–Hückel equation",
    "ideal": "no activity correction (ideal solution)",
    "bates-guggenheim": "the Bates–Guggenheim equation",
    "truesdell-jones": "the Truesdell–Jones equation",
    "specific": "the specific ion interaction equation",
}


def paragraphs(audit: Audit) -> list[str]:
    """The method in short paragraphs."""
    model = str(audit.settings["prediction.activity_model"])
    air = (
        f"Solutions are taken as open to air with {audit.settings['prediction.co2_partial_pressure_atm']:g} atm of "
        "carbon dioxide."
        if audit.settings["prediction.open_to_air"]
        else "Dissolved carbon dioxide is left out unless a recipe holds it."
    )
    return [
        "For every reading the full charge balance of its recipe is solved at the sample's own temperature: strong "
        "ions, every ionization step of every acid, and water, together with the ionic strength. pH is the negative "
        "decadic logarithm of the hydrogen-ion activity; activity coefficients follow "
        f"{MODELS.get(model, plain(model))}. {air}",
        "A residual is observed minus predicted pH. Its u is the full spread of a clean record: the tolerances of "
        "lots, volumes and weighings, temperature, the ionization constants, the activity model, the meter's stated "
        "accuracy, the calibration session, preparation and reading noise. z is the residual over that u.",
        "Findings come from one mixed model of all residuals at once, because a meter read mostly on one bad lot looks "
        "bad itself. Candidate faults are scored by the gain in marginal likelihood; the best is added and all are "
        f"scored again. Over a whole record without faults the chance of any finding is held to "
        f"{half_up(100 * audit.settings['audit.alarm_rate'], 0)} %. Explanations within "
        f"{audit.settings['audit.reach']:g} in log likelihood of a finding are listed as its rivals.",
        "Void, adjusted and out-of-range readings are kept and shown, and are no evidence. " + ROUNDING_NOTE,
        FORMULA_NOTE,
    ]


def sections(audit: Audit) -> list[tuple[str, list[tuple[str, str]]]]:
    """Heading -> lines (name, text) of the Method sheet; a line without name spans the sheet."""
    return [
        (
            "Report",
            [
                ("Report id (from inputs, settings and version)", report_id(audit)),
                ("Version", f"reconcile {__version__}"),
                ("Rows", "{read:,} read = {used:,} used + {set_aside:,} set aside".format(**audit.rows)),
                *((f"Input: {i['name']}", f"SHA-256 {i['sha256']}") for i in inputs(audit)),
                *((f"Table: {name}", f"SHA-256 {digest}") for name, digest in constants().items()),
            ],
        ),
        ("Method", [("", text) for text in paragraphs(audit)]),
        ("Status of a reading", [(STATUSES[s], meaning) for s, meaning in STATUS_MEANINGS.items()]),
        ("Cautions", [("", text) for text in (*CAUTIONS, UNSIGNED)]),
    ]
