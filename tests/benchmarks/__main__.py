"""Measures of speed, memory and error in one run: ``python -m tests.benchmarks`` from the project's folder.

Ratios count, since both sides are measured in the same run; seconds are for orientation on one machine. Figures are
medians, errors and shares the worst of all repeats; the spread runs from the least to the greatest of them.
"""

import os

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")  # before numpy comes in: one core, as the command line runs

import platform
import sys
import time

import numpy as np

from tests.benchmarks import engine, network, study
from tests.benchmarks.report import table


def main() -> None:
    """Measure everything and print one table."""
    start = time.perf_counter()
    rows = []
    for row in (*network.measure(), *engine.measure(), *study.measure()):
        rows.append(row)
    print(table(rows))
    missed = [row.measure.strip() for row in rows if row.cells()[-1] == "missed"]
    print(f"\nmissed: {'; '.join(missed) or 'nothing'}")
    busy = f", load {os.getloadavg()[0]:.1f}" if hasattr(os, "getloadavg") else ""
    versions = f"Python {platform.python_version()}, numpy {np.__version__}"
    print(f"{os.cpu_count()} cores{busy}, {versions}, {time.perf_counter() - start:.0f} s in all")
    sys.stdout.flush()


if __name__ == "__main__":
    main()
