"""`python -m reconcile` is the command `reconcile`."""

from reconcile.cli.app import main

if __name__ == "__main__":
    main()
