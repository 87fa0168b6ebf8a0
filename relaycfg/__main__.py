"""Runs the program as ``python -m relaycfg``."""

from relaycfg.cli import main

if __name__ == "__main__":
    main()
