"""Its place puts tests/ on the import path, so that every test may use builders.py.

One thread of linear algebra for every test process, as the command line has it; set before numpy is imported.
"""

from __future__ import annotations

import os

from reconcile.cli.app import THREADS

for name in THREADS:
    os.environ.setdefault(name, "1")
