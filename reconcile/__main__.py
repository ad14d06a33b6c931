"""`python -m reconcile` and the console script: the command `reconcile`, interruptible from its first moment."""

from __future__ import annotations

import sys

INTERRUPTED = 130


def main() -> None:
    """Run the command; an interruption while it is still loading ends like any other."""
    try:
        from reconcile.cli.app import main as run

        run()
    except KeyboardInterrupt:
        print("Interrupted.", file=sys.stderr)
        sys.exit(INTERRUPTED)


if __name__ == "__main__":
    main()
