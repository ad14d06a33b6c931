"""What was planted in a simulated record: the truth beside it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any


@dataclass(frozen=True)
class Planted:
    """One planted fault, in the words that a finding would use.

    kind, subject, subject_type : as a finding has them; for one reading the subject is (batch, meter, row)
    size, unit : estimate that a finding should give; None where the kind has none
    fault : name of the fault function that planted it
    detail : whatever else is true: "substance", "since" (ISO), "until", "total", "pivot", "component", "variant", ...
    readings : indices of the readings that it changed
    """

    kind: str
    subject: str | tuple[str, ...]
    subject_type: str
    size: float | None
    unit: str
    fault: str
    detail: Mapping[str, Any] = field(default_factory=dict)
    readings: tuple[int, ...] = ()
