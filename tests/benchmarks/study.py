"""The study's figures: ride-through of all settings against stepping each, and derive from file to sheet by phase."""

import time
from collections import defaultdict
from collections.abc import Iterator
from contextlib import ExitStack
from dataclasses import replace
from pathlib import Path
from unittest.mock import patch

import numpy as np

from relaycfg import __version__
from relaycfg.files import read_site, templates_dir
from relaycfg.model.site import Site
from relaycfg.relay import run
from relaycfg.sheet import render
from relaycfg.study import derive, evidence, study
from relaycfg.study.ladder import Ladder
from relaycfg.study.ride_through import Runs, ride_through
from tests.benchmarks.report import REPEATS, Row, ratios, seconds

EXAMPLE = Path(__file__).resolve().parents[2] / "examples" / "workshop" / "site.toml"
TRIED = 60
"""(pickup, delay) pairs stepped one by one; the rest is extrapolated."""
BEFORE_S = 9.0


def measure() -> Iterator[Row]:
    """All rows of the study."""
    yield from all_settings()
    yield from many_courses()
    yield from by_phase()
    yield from by_boards()


def fresh(ladder: Ladder) -> Ladder:
    """The same ladder with nothing remembered."""
    return replace(ladder, runs=replace(ladder.runs))


def step(ladder: Ladder, rung: int, delay: int) -> bool:
    """Whether one setting holds through every course, by the plain machine."""
    runs = ladder.runs
    count, _, channels = runs.severity.shape
    around = np.full((count, 1, channels), runs.standing)
    pickup = ladder.sensitive[rung]
    trip_s = run(
        np.concatenate([around, runs.severity, around], axis=1),
        np.concatenate([np.full((count, 1), BEFORE_S), runs.duration_s, np.full((count, 1), np.inf)], axis=1),
        pickup,
        pickup * ladder.dropout_ratio,
        ladder.shortest[delay],
        ladder.reset,
        ladder.hold_s,
        "shared" if runs.shared else "per phase",
        lag_s=runs.window_s,
    )
    return bool(np.isinf(trip_s).all())


def all_settings() -> Iterator[Row]:
    """(h) Every element of the example; mismatches among the pairs tried."""
    site = read_site(EXAMPLE)
    ladders = evidence.gather(site, site.relay, 500, 1).ladders
    settings = sum(len(x.pickups) * len(x.delays) for x in ladders.values())
    rng, took, wrong = np.random.default_rng(1), [], []
    for _ in range(REPEATS):
        quick = min(seconds(lambda: [fresh(x).fastest() for x in ladders.values()]) for _ in range(3))
        slow, missed = 0.0, 0
        for ladder in ladders.values():
            fastest = ladder.fastest()
            rungs, delays = rng.integers(len(ladder.pickups), size=TRIED), rng.integers(len(ladder.delays), size=TRIED)
            delays[::2] = np.clip(fastest[rungs] + rng.integers(-1, 1, TRIED), 0, len(ladder.delays) - 1)[::2]
            start = time.perf_counter()
            held = [step(ladder, int(r), int(d)) for r, d in zip(rungs, delays, strict=True)]
            slow += (time.perf_counter() - start) / TRIED * len(ladder.pickups) * len(ladder.delays)
            missed += int((np.array(held) != (delays >= fastest[rungs])).sum())
        took.append(slow / quick)
        wrong.append(float(missed))
    yield Row(f"stepping all {settings} settings (extrapolated) / ride-through, example", took, "{:.0f}", least=300)
    yield Row(f"  mismatches in {TRIED * len(ladders)} settings tried", wrong, "{:.0f}", 0, worst=True)
    finer = {f: _finer(x) for f, x in ladders.items()}
    ten = ratios(
        lambda: [fresh(x).fastest() for x in finer.values()], lambda: [fresh(x).fastest() for x in ladders.values()]
    )
    yield Row("ride-through of ten times the settings / of all", ten, "{:.2f}", 2.5)


def _finer(ladder: Ladder) -> Ladder:
    """Ten times the delays."""
    element = ladder.element
    return replace(ladder, element=replace(element, delay_s=replace(element.delay_s, step=element.delay_s.step / 10)))


def many_courses() -> Iterator[Row]:
    """Ride-through where the courses are many and drawn: 50 pickups against one comparison with one level."""
    rng, count, pieces = np.random.default_rng(2), 2000, 30
    severity = rng.uniform(200, 300, (count, pieces, 3))
    lasting = rng.uniform(0, 2, (count, pieces))
    names = tuple(map(str, range(count)))
    runs = Runs(severity, lasting, names, tuple(range(count)), dict(enumerate(names)), 205.0, "standing", 0.02, False)
    pickups = np.linspace(210, 310, 50)
    took = ratios(lambda: ride_through(replace(runs), pickups, 0.97 * pickups), lambda: severity >= 265.0)
    yield Row(f"ride-through of 50 pickups / one bare compare, {count} courses of {pieces} pieces", took, "{:.0f}", 80)


class Clock:
    """Seconds spent below named functions of a module while it is patched."""

    def __init__(self) -> None:
        self.spent: dict[str, float] = defaultdict(float)

    def around(self, name: str, work):
        """``work`` with its seconds added up under ``name``."""

        def timed(*arguments, **options):
            start = time.perf_counter()
            try:
                return work(*arguments, **options)
            finally:
                self.spent[name] += time.perf_counter() - start

        return timed


PHASES = {
    "gather": (study, "gather"),
    "gather: states": (evidence, "sampled"),
    "gather: levels": (evidence, "supply_levels"),
    "gather: healthy taps": (evidence, "healthy_taps"),
    "gather: cases": (evidence, "must_hold_cases"),
    "gather: scenarios": (evidence, "all_scenarios"),
    "settle": (study, "settle"),
    "judge": (study, "_judge"),
}


def phases(samples: int) -> dict[str, float]:
    """Seconds of one derive of the example from its files to the PDF, by phase."""
    clock = Clock()
    with ExitStack() as stack:
        for name, (module, function) in PHASES.items():
            stack.enter_context(patch.object(module, function, clock.around(name, getattr(module, function))))
        start = time.perf_counter()
        site = clock.around("read", read_site)(EXAMPLE)
        found = clock.around("derive", derive)(site, samples, 1)
        clock.around("sheet", render)(found, templates_dir(), __version__)
        clock.spent["all"] = time.perf_counter() - start
    parts = sum(t for name, t in clock.spent.items() if name.startswith("gather:"))
    clock.spent["gather: the rest (breaks at nominal, ladders)"] = clock.spent["gather"] - parts
    return clock.spent


def by_phase() -> Iterator[Row]:
    """(i) At two sizes of sample, and how it grows from one to the other."""
    phases(100)
    rest = "gather: the rest (breaks at nominal, ladders)"
    order = ("all", "read", "derive", "gather", *(n for n in PHASES if ":" in n), rest, "settle", "judge", "sheet")
    runs = {samples: [phases(samples) for _ in range(REPEATS)] for samples in (2000, 20_000)}
    for samples, spent in runs.items():
        for name in order:
            label = "read, derive and draw" if name == "all" else f"  {name}"
            yield Row(f"{label}, example, {samples} samples, ms", [1e3 * s[name] for s in spent], "{:.0f}")
    less, more = ([s["derive"] for s in spent] for spent in runs.values())
    yield Row("derive, ten times the samples", [m / n for n, m in zip(less, more, strict=True)], "{:.1f}", 10)


def by_boards() -> Iterator[Row]:
    """Derive of the example with its office repeated: every board adds a break place, so the work grows with both."""
    took: dict[int, list[float]] = {}
    places = {}
    for boards in (4, 8, 16, 32):
        made = repeated(read_site(EXAMPLE), boards)
        places[boards] = len(made.places)
        derive(made, 20, 1)
        took[boards] = [seconds(lambda made=made: derive(made, 500, 1)) for _ in range(REPEATS)]
        label = f"derive, {boards} boards, {places[boards]} places, {len(made.loads)} loads, 500 samples, ms"
        yield Row(label, [1e3 * t for t in took[boards]], "{:.0f}")
    for boards in (8, 16, 32):
        times = [large / small for small, large in zip(took[4], took[boards], strict=True)]
        yield Row(f"derive, {boards} boards / 4 boards", times, "{:.1f}")
    share = boards * places[boards] / (4 * places[4])
    each = [large / small / share for small, large in zip(took[4], took[32], strict=True)]
    yield Row("  cost of a board and place, 32 boards / 4 boards", each, "{:.2f}", 2)


def repeated(site: Site, boards: int) -> Site:
    """The site with copies of its board "Office" until it has so many boards; the office's watts shared among them."""
    office = site.board("Office")
    names = [f"Office {k}" for k in range(boards - len(site.boards))]
    copies = tuple(replace(office, name=n) for n in names)
    share = 1 / (1 + len(names))
    own = [replace(x, p_w=share * x.p_w, q_var=share * x.q_var) for x in site.loads if x.board == office.name]
    rest = tuple(x for x in site.loads if x.board != office.name)
    loads = tuple(replace(x, board=n, name=f"{x.name} {n}") for n in names for x in own)
    return replace(site, boards=site.boards + copies, loads=(*rest, *own, *loads))
