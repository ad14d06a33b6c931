"""Puts the simulator's chemistry on the import path: readings here are made by it, not by the engine under test."""

from __future__ import annotations

import sys
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parents[1] / "simulated"))
