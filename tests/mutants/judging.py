"""What becomes of a mutant: the tests on a copy of the tree, nearest first, in a process that has the libraries."""

import difflib
import json
import os
import shutil
import signal
import sys
import time
import traceback
from dataclasses import asdict
from pathlib import Path

import hypothesis
import pytest
import scipy.optimize  # noqa: F401  loaded once, not by every mutant

from tests.mutants.sampling import TOP, Mutant

COPIED = ("relaycfg", "tests", "templates", "examples")
NEAR = {"network": ("tests/network",), "relay": ("tests/relay",), "study": ("tests/study",)}
WIDE = ("tests/network", "tests/relay", "tests/study", "tests/reference", "tests/test_end_to_end.py")
KEPT_LOADED = ("-W", "ignore::pytest.PytestAssertRewriteWarning")
NOT_RUN = (4, 5, 99)
"""Exit codes of pytest without any test, and of a process that never came to it."""
TIMEOUT_S = 120.0


def run_tests(copy: Path, tests: list[str], log: Path) -> int:
    """pytest's exit code in this process, made to see the copy instead of the tree it was started from."""
    os.setsid()
    with log.open("w") as file:
        os.dup2(file.fileno(), 1)
        os.dup2(file.fileno(), 2)
    for name in [n for n in sys.modules if n.split(".")[0] in ("tests", "relaycfg")]:
        del sys.modules[name]
    sys.path[:] = [str(copy), *(p for p in sys.path if p and Path(p).resolve() != TOP)]
    os.environ["PYTHONPATH"] = str(copy)
    os.chdir(copy)
    phases = (hypothesis.Phase.explicit, hypothesis.Phase.generate)
    hypothesis.settings.register_profile("mutants", derandomize=True, database=None, phases=phases)
    hypothesis.settings.load_profile("mutants")
    code = int(pytest.main(["-x", "-q", "--tb=line", "-p", "no:cacheprovider", *KEPT_LOADED, *tests]))
    sys.stdout.flush()
    return code


def outcome_of(copy: Path, tests: list[str], log: Path, timeout_s: float = TIMEOUT_S) -> tuple[str, str]:
    """Outcome of tests in a copy, from a forked process that already has the libraries; and the test that failed."""
    child = os.fork()
    if child == 0:
        try:
            os._exit(run_tests(copy, tests, log))
        except BaseException:
            traceback.print_exc()
            os._exit(99)
    started = time.monotonic()
    while time.monotonic() - started < timeout_s:
        done, status = os.waitpid(child, os.WNOHANG)
        if done:
            code = os.waitstatus_to_exitcode(status)
            if code in NOT_RUN:
                raise RuntimeError(log.read_text(errors="replace"))
            failed = [x for x in log.read_text(errors="replace").splitlines() if x.startswith(("FAILED", "ERROR"))]
            return "survived" if code == 0 else "killed", failed[-1] if failed else ""
        time.sleep(0.02)
    os.killpg(child, signal.SIGKILL)
    os.waitpid(child, 0)
    return "timed out", ""


def judged(mutant: Mutant, copy: Path, wide: bool) -> dict[str, object]:
    """What becomes of one mutant."""
    target = copy / mutant.module
    original = target.read_text()
    near = list(NEAR.get(target.parent.name, ()))
    started = time.monotonic()
    try:
        target.write_text(mutant.code)
        shutil.rmtree(target.parent / "__pycache__", ignore_errors=True)
        outcome, by = outcome_of(copy, near, copy / "log.txt")
        if wide and outcome == "survived":
            outcome, by = outcome_of(copy, [t for t in WIDE if t not in near], copy / "log.txt")
            by = by and f"wide: {by}"
    finally:
        target.write_text(original)
        shutil.rmtree(target.parent / "__pycache__", ignore_errors=True)
    diff = difflib.unified_diff(original.splitlines(), mutant.code.splitlines(), n=0, lineterm="")
    changed = [line for line in diff if line[:1] in "+-" and not line.startswith(("+++", "---"))]
    return asdict(mutant) | {"outcome": outcome, "by": by, "diff": changed, "took_s": time.monotonic() - started}


def work(mutants: list[Mutant], folder: Path, results: Path, wide: bool) -> None:
    """Judge mutants one after the other in a copy of their own; one JSON line each."""
    copy = folder / f"copy-{os.getpid()}"
    for part in COPIED:
        shutil.copytree(TOP / part, copy / part)
    for file in TOP.glob("*.*"):
        if file.is_file():
            shutil.copy(file, copy / file.name)
    first = WIDE if wide else sorted({test for tests in NEAR.values() for test in tests})
    assert outcome_of(copy, list(first), copy / "log.txt", 900)[0] == "survived", (copy / "log.txt").read_text()
    broken = Mutant("relaycfg/relay/bands.py", "broken", 1, "raise SystemError\n")
    assert judged(broken, copy, False)["outcome"] == "killed"
    for mutant in mutants:
        with results.open("a") as file:
            file.write(json.dumps(judged(mutant, copy, wide)) + "\n")
