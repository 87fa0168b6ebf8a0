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
from relaycfg.model.geometry import FloatArray
from relaycfg.model.site import Site
from relaycfg.relay import run, trip_table
from relaycfg.sheet import render
from relaycfg.study import derive, evidence, study
from relaycfg.study.ladder import Ladder
from tests.benchmarks.report import REPEATS, Row, ratios, seconds

EXAMPLE = Path(__file__).resolve().parents[2] / "examples" / "workshop" / "site.toml"
TRIED = 60
"""(pickup, delay) pairs stepped one by one; the rest is extrapolated."""
BEFORE_S = 9.0


def measure() -> Iterator[Row]:
    """All rows of the study."""
    yield from all_settings()
    yield from tables()
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
        lag_s=runs.lag_s,
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


SIGNALS, EVENTS, STEPS, STEP_S = 8, 10_000, 3000, 0.01
CHUNK = 1000
"""Events handled at once."""
STEPPED = 500
"""Events stepped together by the plain machine: enough that calls no longer weigh."""


def excursions(rng: np.random.Generator, noise_v: float) -> FloatArray:
    """One signal [events, steps]: 230 V with three swells an event, up to 80 V and 3 s, on top of one another."""
    volts = np.full((EVENTS, STEPS), 230, np.float32)
    if noise_v:
        volts += rng.normal(0, noise_v, volts.shape).astype(np.float32)
    for _ in range(3):
        begin, lasting = rng.integers(0, STEPS, EVENTS), rng.integers(5, 300, EVENTS)
        height = rng.uniform(0, 80, EVENTS)
        for event in range(EVENTS):
            volts[event, begin[event] : begin[event] + lasting[event]] += height[event]
    return volts


def tables() -> Iterator[Row]:
    """All settings on all events: 8 signals, 50 levels x 37 delays each, 2000 settings of one stage a signal."""
    pickup, delay_s = np.linspace(240, 320, 50), 0.055 + 0.1 * np.arange(37)
    clock = np.full((1, STEPS), STEP_S)
    rng = np.random.default_rng(3)
    for noise_v in (0.0, 1.0):
        signals = [excursions(rng, noise_v) for _ in range(SIGNALS)]

        def all_entries(count: int, signals=signals) -> list[FloatArray]:
            stages = np.random.default_rng(4).integers((SIGNALS * [[50, 37]]), size=(count, SIGNALS, 2))
            first = []
            for k in range(0, EVENTS, CHUNK):
                every = [
                    trip_table(x[k : k + CHUNK, :, None], clock, pickup, 0.97 * pickup).instants(delay_s)
                    for x in signals
                ]
                trips = np.full((count, min(CHUNK, EVENTS - k)), np.inf)
                for entries, stage in zip(every, np.moveaxis(stages, 1, 0), strict=True):
                    np.minimum(trips, entries[stage[:, 0], stage[:, 1]], out=trips)
                first.append(trips)
            return first

        label = f"trip tables, {EVENTS} events x {STEPS} steps x {SIGNALS} signals, noise {noise_v:g} V"
        bare = [seconds(lambda signals=signals: [x >= 265.0 for x in signals]) for _ in range(REPEATS)]
        made, few, many = (
            [seconds(lambda count=count: all_entries(count)) for _ in range(3)] for count in (1, 200, 2000)
        )
        yield Row(f"{label}: all entries / one bare compare", [t / min(bare) for t in made], "{:.0f}", 80)
        yield Row("  the same with 2000 settings", [t / min(bare) for t in many], "{:.0f}")
        yield Row("  2000 settings / 200 settings", [m / f for f, m in zip(few, many, strict=True)], "{:.2f}", 2.5)
        part = signals[0][:STEPPED, :, None].astype(float)
        lasting = np.full((STEPPED, STEPS), STEP_S)
        table = trip_table(part, lasting, pickup, 0.97 * pickup).instants(delay_s)
        tried = [(p, d) for p in range(0, 50, 14) for d in range(0, 37, 12)]
        start = time.perf_counter()
        slow = np.array([run(part, lasting, pickup[p], 0.97 * pickup[p], delay_s[d]) for p, d in tried])
        each = (time.perf_counter() - start) / len(tried)
        stepped = each * EVENTS / STEPPED * len(pickup) * len(delay_s) * SIGNALS
        yield Row(
            "  stepping every setting (extrapolated) / all entries", [stepped / t for t in made], "{:.0f}", least=300
        )
        found = np.array([table[p, d] for p, d in tried])
        wrong = float((~np.isclose(found, slow, rtol=0, atol=1e-9)).sum())
        yield Row(f"  mismatches in {slow.size} entries stepped", [wrong], "{:.0f}", 0, worst=True)


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
