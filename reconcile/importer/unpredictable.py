"""What no equilibrium in water describes: solvents beside water, and substances that stay undissolved."""

from __future__ import annotations

from collections.abc import Mapping

from reconcile.records.substances import name_key

MOST_SOLVENT: Mapping[str, float] = {
    "ethanol": 50.0,
    "methanol": 50.0,
    "2-propanol": 50.0,
    "acetonitrile": 50.0,
    "propylene glycol": 100.0,
    "glycerol": 100.0,
}
"""Most of a solvent of the library that leaves a solution one in water [g/L]; common practice, no source."""


def _keys(*names: str) -> frozenset[str]:
    return frozenset(name_key(name) for name in names)


_SOLVENTS = _keys(
    "propan-1-ol", "1-propanol", "tert-butanol", "benzyl alcohol", "acetone", "dimethyl sulfoxide", "DMSO",
    "dimethylformamide", "DMF", "tetrahydrofuran", "THF", "1,4-dioxane", "dioxane", "ethylene glycol",
    "industrial methylated spirit", "macrogol 400", "PEG 400", "polyethylene glycol 400", "ethyl acetate",
)  # fmt: skip
_SUSPENDED = _keys(
    "aluminium hydroxide", "aluminum hydroxide", "aluminium hydroxide gel", "magnesium hydroxide", "kaolin", "talc",
    "bentonite", "zinc oxide", "titanium dioxide", "calcium phosphate", "tricalcium phosphate", "hydroxyapatite",
    "activated carbon", "activated charcoal", "silica gel", "barium sulfate",
)  # fmt: skip
_SAY_SUSPENDED = ("suspension", "emulsion", "slurry", "lipid", "cream", "resin")


def unpredictable(text: str) -> str:
    """Problem code of a name that the library does not hold, where it says that nothing can be predicted; else ""."""
    key = name_key(text)
    if key in _SOLVENTS:
        return "solvent-mixed"
    return "suspension" if key in _SUSPENDED or any(word in key.split() for word in _SAY_SUSPENDED) else ""
