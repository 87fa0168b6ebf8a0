"""``python -m tests.reference``: every reference in one table; status 1 where one does not hold.

``--quick`` compares as many random networks with the other engines as a test run does; ``--cases`` none.
"""

import argparse
import sys
from collections.abc import Iterator
from importlib import import_module

from tests.reference.case import folders, read_case, row_of
from tests.reference.methods import measure
from tests.reference.table import Row, print_rows

ENGINES = ("engines", "ngspice", "roots")
"""Modules whose ``rows(quick)`` compare the package with other engines."""


def case_rows() -> Iterator[Row]:
    """A row for every check of every folder that can be driven."""
    for folder in folders():
        for check in read_case(folder).checks:
            if not check.not_in_product:
                yield row_of(check, measure(folder, check))


def engine_rows(quick: bool) -> Iterator[Row]:
    """The rows of the other engines."""
    for name in ENGINES:
        yield from import_module(f"tests.reference.{name}").rows(quick)


def main() -> int:
    """Print the table, then what cannot be driven yet."""
    parser = argparse.ArgumentParser(prog="python -m tests.reference", description=__doc__)
    parser.add_argument("--quick", action="store_true", help="as many random networks as a test run")
    parser.add_argument("--cases", action="store_true", help="only the folders of tests/reference/cases")
    options = parser.parse_args()

    def rows() -> Iterator[Row]:
        yield from case_rows()
        if not options.cases:
            yield from engine_rows(options.quick)

    verdicts = print_rows(rows())
    failed, skipped = verdicts["FAILS"], verdicts["skipped"]
    print(f"\n{verdicts.total()} references: {failed} do not hold, {skipped} skipped.\n\nNot in the product yet:")
    for check in (c for folder in folders() for c in read_case(folder).checks if c.not_in_product):
        print(f"{check.id}: {check.not_in_product}")
    return 1 if failed else 0


if __name__ == "__main__":
    sys.exit(main())
