"""Mutants of the core: ``python -m tests.mutants relaycfg/network relaycfg/relay --each 25``; needs cosmic-ray.

Samples the mutants of every module evenly, runs the package's own tests on each in a copy of the tree and prints a
table by module and every mutant that no test notices. A survivor is closed by a test or is equivalent. Random
examples of the tests are fixed meanwhile, so that a run can be repeated.
"""

import argparse
import json
import os
import random
import tempfile
import traceback
from collections import Counter, defaultdict
from pathlib import Path

from tests.mutants.judging import work
from tests.mutants.sampling import TOP, again, sample


def main() -> None:
    """Sample, run, print."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("packages", nargs="*", help="folders or files, such as relaycfg/network")
    parser.add_argument("--each", type=int, default=25, help="mutants a module")
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--workers", type=int, default=1)
    parser.add_argument("--again", type=Path, help="only the survivors among these results")
    parser.add_argument("--wide", action="store_true", help="survivors of the package's own tests meet the others too")
    parser.add_argument("--results", type=Path, help="JSON lines to append to; what stands in it is not run again")
    given = parser.parse_args()
    modules = [m for p in given.packages for m in ([TOP / p] if p.endswith(".py") else sorted((TOP / p).glob("*.py")))]
    names = [str(m.relative_to(TOP)) for m in modules if m.name != "__init__.py"]
    mutants = [mutant for name in names for mutant in sample(name, given.each, given.seed)]
    mutants += again(given.again) if given.again else []
    random.Random(given.seed).shuffle(mutants)
    if given.results and given.results.exists():
        done = {json.loads(line)["code"] for line in given.results.read_text().splitlines()}
        mutants = [m for m in mutants if m.code not in done]
    with tempfile.TemporaryDirectory() as temporary:
        results = given.results or Path(temporary) / "results.jsonl"
        children = []
        for number in range(given.workers):
            child = os.fork()
            if child == 0:
                try:
                    work(mutants[number :: given.workers], Path(temporary), results, given.wide)
                except BaseException:
                    traceback.print_exc()
                finally:
                    os._exit(0)
            children.append(child)
        for child in children:
            os.waitpid(child, 0)
        report([json.loads(line) for line in results.read_text().splitlines()])


def report(results: list[dict[str, object]]) -> None:
    """A line a module, then the survivors."""
    counts: dict[object, Counter[object]] = defaultdict(Counter)
    for result in results:
        counts[result["module"]][result["outcome"]] += 1
    print(f"{'module':36}{'tried':>8}{'killed':>8}{'timed out':>11}{'survived':>10}")
    for module, outcome in [*sorted(counts.items(), key=str), ("all", sum(counts.values(), Counter()))]:
        figures = (sum(outcome.values()), outcome["killed"], outcome["timed out"], outcome["survived"])
        print(f"{module!s:36}{figures[0]:8}{figures[1]:8}{figures[2]:11}{figures[3]:10}")
    for result in results:
        if result["outcome"] != "killed":
            print(f"\n{result['module']}:{result['line']} {result['operator']} {result['outcome']}")
            print(*result["diff"], sep="\n")  # type: ignore[misc]


if __name__ == "__main__":
    main()
