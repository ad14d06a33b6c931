"""Its place puts tests/ on the import path, so that every test may use builders.py.

One thread of linear algebra for every test process, as the command line has it; set before numpy is imported. No
substances of whoever runs the tests: the configuration's folder is one that is not there.
"""

from __future__ import annotations

import os
from pathlib import Path

from reconcile.cli.app import THREADS
from reconcile.records.own_substances import ENVIRONMENT

for name in THREADS:
    os.environ.setdefault(name, "1")
os.environ[ENVIRONMENT] = str(Path(__file__).parent / "no configuration")
