"""One JSON document on standard output, and nothing else."""

from __future__ import annotations

import sys
from collections.abc import Mapping
from typing import Any


def print_json(document: Mapping[str, Any]) -> None:
    """Print a document as the reporter writes its own: texts plain, numbers that are none null."""
    from reconcile.reporter.to_json import to_text, value

    sys.stdout.write(to_text({key: value(thing) for key, thing in document.items()}))
