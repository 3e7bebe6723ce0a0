"""Run the command line as ``python -m tmsolve``."""

from .cli import main

if __name__ == "__main__":
    raise SystemExit(main())
