"""Audits pH readings against batch recipes by full chemical equilibrium.

The doors, each loaded when first used: predict_ph, read, audit, meters, fit_pka, write_report, write_newbook, recheck,
since_previous.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from reconcile.chemistry.predict import predict_ph
    from reconcile.pipeline import audit, fit_pka, meters, read
    from reconcile.replay import recheck
    from reconcile.reporter.newbook import write_newbook
    from reconcile.reporter.previous import since_previous
    from reconcile.reporter.write import write_report

__version__ = "0.1.0"
__all__ = [
    "__version__",
    "audit",
    "fit_pka",
    "meters",
    "predict_ph",
    "read",
    "recheck",
    "since_previous",
    "write_newbook",
    "write_report",
]

_DOORS = {
    "predict_ph": "reconcile.chemistry.predict",
    "read": "reconcile.pipeline",
    "audit": "reconcile.pipeline",
    "meters": "reconcile.pipeline",
    "fit_pka": "reconcile.pipeline",
    "recheck": "reconcile.replay",
    "since_previous": "reconcile.reporter.previous",
    "write_newbook": "reconcile.reporter.newbook",
    "write_report": "reconcile.reporter.write",
}


def __getattr__(name: str) -> Any:
    if name in _DOORS:
        return getattr(import_module(_DOORS[name]), name)
    raise AttributeError(f"module 'reconcile' has no attribute {name!r}")


def __dir__() -> list[str]:
    return sorted([*globals(), *_DOORS])
