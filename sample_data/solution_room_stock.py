"""The bottles and the kinds of solution of the invented solution room."""

from __future__ import annotations

from dataclasses import dataclass

ACETIC, ACETATE = "acetic acid", "sodium acetate"
CITRIC, CITRATE = "citric acid monohydrate", "trisodium citrate dihydrate"
PRIMARY, SECONDARY = "sodium dihydrogen phosphate monohydrate", "disodium hydrogen phosphate"
TRIS, TRIS_HCL = "Tris base", "Tris hydrochloride"
LACTIC, LACTATE = "lactic acid", "sodium lactate"
BASE, STRONG = "sodium hydroxide", "hydrochloric acid"


@dataclass
class Lot:
    """One bottle: what its label says, what is in it, and how strong it really is."""

    name: str
    label: str
    opened: int
    strength: float = 0.0
    """mol/L of a stock solution; 0 for a solid"""
    content: str = ""
    factor: float = 1.0
    tolerance: float = 1.0


LOTS = [
    Lot("AC-0412", ACETIC, 0, 1.0),
    Lot("AC-0427", ACETIC, 17, 1.0, factor=1.22),
    Lot("SA-1105", ACETATE, 0),
    Lot("SA-1131", ACETATE, 28),
    Lot("CI-2209", CITRIC, 0),
    Lot("CI-2218", CITRIC, 25),
    Lot("TC-2301", CITRATE, 0),
    Lot("PM-3014", PRIMARY, 0),
    Lot("PM-3020", PRIMARY, 30),
    Lot("PD-3107", SECONDARY, 0),
    Lot("PD-3112", SECONDARY, 20, content="disodium hydrogen phosphate heptahydrate"),
    Lot("TR-4001", TRIS, 0),
    Lot("TR-4009", TRIS, 27),
    Lot("TH-4103", TRIS_HCL, 0, 0.5),
    Lot("LA-5016", LACTIC, 0, 1.0),
    Lot("LA-5023", LACTIC, 22, 1.0, content=ACETIC),
    Lot("SL-5101", LACTATE, 0, 1.0),
    Lot("HC-6102", STRONG, 0, 1.0, tolerance=0.5),
    Lot("HC-6109", STRONG, 19, 1.0, tolerance=0.5),
    Lot("HC-6115", STRONG, 38, 1.0, tolerance=0.5),
    Lot("NH-7001", BASE, 0, 1.0, tolerance=0.5),
    Lot("NH-7006", BASE, 16, 1.0, tolerance=0.5),
    Lot("NH-7010", BASE, 35, 1.0, tolerance=0.5),
]
KINDS: tuple[tuple[str, tuple[str, ...], int, float, float], ...] = (
    # title, substances, batches, and the least and greatest amount of the second per mole of the first
    ("acetate", (ACETIC, ACETATE), 13, 0.5, 2.0),
    ("acetate", (ACETIC, BASE), 10, 0.25, 0.75),
    ("acetate", (ACETATE, STRONG), 5, 0.25, 0.75),
    ("citrate", (CITRIC, CITRATE), 10, 0.4, 2.5),
    ("citrate", (CITRIC, BASE), 8, 0.5, 2.4),
    ("phosphate", (PRIMARY, SECONDARY), 16, 0.4, 2.5),
    ("phosphate", (PRIMARY, BASE), 6, 0.25, 0.75),
    ("phosphate", (SECONDARY, STRONG), 6, 0.15, 0.42),
    ("Tris", (TRIS, STRONG), 12, 0.25, 0.75),
    ("Tris", (TRIS, TRIS_HCL), 6, 0.5, 2.0),
    ("lactate", (LACTIC, BASE), 10, 0.3, 0.75),
    ("lactate", (LACTIC, LACTATE), 6, 0.5, 2.0),
    ("acetic acid", (ACETIC,), 4, 0.0, 0.0),
    ("citric acid", (CITRIC,), 4, 0.0, 0.0),
    ("lactic acid", (LACTIC,), 4, 0.0, 0.0),
)
REMARKS = ("stirred", "second operator", "after filtration", "re-read once, same value", "read at the hatch counter")
