"""How a fit of ionization constants came about, in words: for the page and for the workbook's Method sheet."""

from __future__ import annotations

from reconcile.records.pka_results import PkaFit
from reconcile.reporter.cautions import FORMULA_NOTE, ROUNDING_NOTE
from reconcile.reporter.method import MODELS
from reconcile.reporter.plain import plain


def paragraphs(fit: PkaFit) -> list[str]:
    """The method in short paragraphs."""
    model = str(fit.settings["prediction.activity_model"])
    return [
        "Every reading of a solution that holds the acid is predicted by the full charge balance of its recipe at its "
        "own temperature, with activity coefficients after "
        f"{MODELS.get(model, plain(model))}; the constants (and what was set free) are those that make the weighted "
        "sum of squared differences least. All readings count together; slopes come from implicit differentiation of "
        "the balance. The weight of a reading is the inverse of its variance: noise, shared by the number averaged, "
        "and the tolerances of what was taken for that reading alone.",
        "The noise is estimated from the scatter, by its degrees of freedom, and never taken as less than the share of "
        "the display, resolution over the square root of twelve, or the settings’ floor. Where the record states it, "
        "it is taken as stated unless the readings scatter more than that allows at the 1 % level.",
        "The 95 % interval is a likelihood profile: all values at which the least sum of squares exceeds its minimum "
        "by less than the quantile of F(1, n − p), constants being sought from −2 to 16, a strength factor from a "
        "tenth to ten and an offset up to 2 pH. It holds the noise and what was set free. The standard uncertainty "
        "u holds, besides, what the readings share: the meter’s accuracy and span, the strengths of lots and titrant, "
        "temperature, the activity model and the constants of the other acids (JCGM 100).",
        "A constant is called identifiable when u is at most 0.10 and its correlation with everything else that is "
        "sought stays under 0.99. Otherwise no number is given, but the bound or the relation that is known.",
        "Readings are rejected only by externally studentised residuals in a test at a family-wise 1 % (Rosner 1983, "
        "doi:10.1080/00401706.1983.10487848). Rejected readings are named and stay in the tables; the result with "
        "every reading stands beside.",
        "Where the number of steps is neither given nor known it is chosen by AICc (Hurvich and Tsai 1989, "
        "doi:10.1093/biomet/76.2.297); every rejected reading counts as a parameter there, and a further step must "
        "lower it by more than 2, or by more than 10 where the readings do not tell its constant.",
        "The thermodynamic constant holds at ionic strength 0 and the readings’ mean temperature. The apparent one is "
        "mixed: activity of the hydrogen ion, molalities of the acid’s forms, at the ionic strength stated. A value at "
        "25 °C is given only with an enthalpy, the library’s or one fitted to readings that span 10 K or more.",
        "The log likelihood ratio of a library acid compares its own constants, within their uncertainties, with the "
        "fitted ones, all shared errors being used in its favour. It is consistent with the readings while twice the "
        "ratio stays within the 99 % quantile of the F distribution.",
        "A gap is a range of neutralisation without readings in which one more would shrink an interval to seven "
        "tenths or less; that is a property of the record, not an instruction to prepare anything. Gaps are not told "
        "where a substance in the solutions has a hazard word beyond corrosive or gives off a gas with acid.",
        ROUNDING_NOTE,
        FORMULA_NOTE,
    ]
