"""The network's figures: ratios against plain evaluation, root finder and dense solve; memory; unresolved states."""

import multiprocessing
import resource
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import numpy as np
from scipy.optimize import fsolve

from relaycfg.model.site import Site
from relaycfg.network import Network, connected, healthy_emf, sampled
from tests.benchmarks.report import REPEATS, Row, ratios, seconds
from tests.network.dense import Dense
from tests.network.sites import board, cable, load, site

STATES = 20_000
STREAMED, CHUNK = 200_000, 4096
ZIP = (0.4, 0.3, 0.3)
MOSTLY_POWER = (0.2, 0.2, 0.6)
BAND = (0.7, 1.2)
PLACE = "B0"
"""The break: incoming neutral of the first board, so that all loads float."""
LINE_OHM, SOURCE_OHM = 0.04 + 0.012j, 0.01 + 0.02j
LOADS = (("L1", 400, 1.0), ("L1", 2300, 0.5), ("L2", 300, 1.0), ("L2", 1500, 0.6), ("L3", 350, 1.0), ("L3", 3100, 0.4))
"""Of every board: line, watts, usage."""


def tree(boards: int, zip_p: tuple[float, float, float] = ZIP, earthed: bool = False, thin: bool = False) -> Site:
    """A tree of boards with six ZIP loads each, two feeds from every board; no earth on the floating side.

    Cables and source are sized to the boards behind them, so that a few percent drop (8 at most) at any size; ``thin``
    gives every cable and the source the same ohms, which drops some 20 percent at 30 boards: an overloaded site.
    """
    placed, share = [], 1.0 if thin else 3 / max(boards, 3)
    for k in range(boards):
        ohm = LINE_OHM if thin else 2 * LINE_OHM / _behind(k, boards)
        placed.append(board(f"B{k}", f"B{(k - 1) // 2}" if k else "source", cable(ohm)))
    loads = [
        load(
            b.name, at, watts * (1 + k % 5 / 5), 0.3 * watts, name=f"{b.name} {n}", zip_p=zip_p, band=BAND, usage=usage
        )
        for k, b in enumerate(placed)
        for n, (at, watts, usage) in enumerate(LOADS)
    ]
    neutral = 1e-4 + 0j if earthed else 0j
    return site(placed, loads, emf_v=235.0, line_ohm=share * SOURCE_OHM, neutral_ohm=neutral, electrode_ohm=5.0)


def _behind(k: int, boards: int) -> int:
    return 1 + sum(_behind(j, boards) for j in (2 * k + 1, 2 * k + 2) if j < boards)


def measure() -> Iterator[Row]:
    """All rows of the network."""
    yield from against_plain_evaluation()
    yield from against_root_finder()
    yield from by_boards()
    yield from single_state()
    yield from memory()
    yield from against_dense()
    yield from unresolved()


def against_plain_evaluation() -> Iterator[Row]:
    """(a) Two plain evaluations: load by load from watts and volts as a script writes it; and the strictest one.

    The strictest takes loads already merged (two to a branch) with their coefficients ready, as the solver has them.
    """
    made = tree(3)
    network, states, emf = Network(made), sampled(made, STATES, 1), healthy_emf(made)
    solved = network.solve(PLACE, states, emf)
    at = [(network.boards.index(x.board), x.lines[0]) for x in made.loads]
    volts = np.array([solved.l_n[b, k] for b, k in at])
    shares = [np.array([p - 1j * q for p, q in _powers(made, n)])[:, None] * states.loads for n in range(3)]
    merged = [(s[::2] + s[1::2]) / 230.0 ** (2 - n) for n, s in enumerate(shares)]

    def solve() -> None:
        network.solve(PLACE, states, emf)

    def by_load() -> None:
        m = np.clip(np.abs(volts) / 230.0, *BAND)
        powers = states.loads * (watts[0] * m * m + watts[1] * m + watts[2])
        np.conj(powers * (1 + 0.3j) / (m * 230.0) ** 2) * volts

    watts = np.array([[p for p, _ in _powers(made, n)] for n in range(3)])[:, :, None]
    by_branch = volts[::2].copy()
    yield Row(
        f"solve / plain currents load by load (18), 3 boards, {STATES} states", ratios(solve, by_load), "{:.1f}", 25
    )
    took = ratios(solve, lambda: plain(by_branch, *merged))
    yield Row("solve / plain currents of merged branches (9), coefficients ready", took, "{:.1f}", 25)


def plain(u: np.ndarray, cz: np.ndarray, ci: np.ndarray, cp: np.ndarray) -> np.ndarray:
    """All currents once, complex, as written in the load law."""
    r = 1 / np.clip(np.abs(u), BAND[0] * 230.0, BAND[1] * 230.0)
    return u * (cz + r * (ci + r * cp))


def _powers(made: Site, n: int) -> list[tuple[float, float]]:
    return [(x.p_w * x.zip_p[n], x.q_var * x.zip_q[n]) for x in made.loads]


def against_root_finder() -> Iterator[Row]:
    """(b) What a script would do: nodal equations of L1 L2 L3 N in a loop of fsolve, from the intact voltages."""
    made, count = tree(1), 60
    network, states, emf = Network(made), sampled(made, STATES, 1), healthy_emf(made)
    solved = network.solve(PLACE, states, emf)
    lines = np.array([x.lines[0] for x in made.loads])
    powers = np.array([_powers(made, n) for n in range(3)])
    series = made.source.line_ohm + made.boards[0].cable.line_ohm
    start = np.concatenate([emf.real, [0.0], emf.imag, [0.0]])

    def mismatch(x: np.ndarray, factors: np.ndarray) -> np.ndarray:
        v = x[:4] + 1j * x[4:]
        u = (v[:3] - v[3])[lines]
        m = np.clip(np.abs(u) / 230.0, *BAND)
        p, q = (powers[0, :, k] * m * m + powers[1, :, k] * m + powers[2, :, k] for k in (0, 1))
        i = np.bincount(lines, factors * (u * (p - 1j * q) / (m * 230.0) ** 2).real, 3) + 1j * np.bincount(
            lines, factors * (u * (p - 1j * q) / (m * 230.0) ** 2).imag, 3
        )
        out = np.append((v[:3] - emf) / series + i, -i.sum())
        return np.concatenate([out.real, out.imag])

    def script(first: int) -> list[np.ndarray]:
        return [fsolve(mismatch, start, args=(states.loads[:, k],)) for k in range(first, first + count)]

    took, same = [], []
    for repeat in range(REPEATS):
        found: list[np.ndarray] = []
        slow = seconds(lambda found=found, repeat=repeat: found.extend(script(repeat * count))) / count
        took.append(slow / (seconds(lambda: network.solve(PLACE, states, emf)) / STATES))
        volts = np.array([x[:3] - x[3] + 1j * (x[4:7] - x[7]) for x in found])
        ours = solved.l_n[0, :, repeat * count : (repeat + 1) * count].T
        same.append(float((np.abs(volts - ours).max(axis=1) < 1e-3).mean()))
    yield Row("fsolve loop / solve, a state, 1 board", took, "{:.0f}", least=500)
    yield Row("  share of states where both agree to 1 mV", same, "{:.3f}")


def by_boards() -> Iterator[Row]:
    """(c) States a second, all node voltages included, and what a board costs on a large site against a small one."""
    a_board: dict[int, list[float]] = {}
    for boards in (1, 3, 8, 30):
        made = tree(boards)
        network, states, emf = Network(made), sampled(made, STATES, 1), healthy_emf(made)
        network.solve(PLACE, states, emf)
        took = [
            seconds(lambda n=network, s=states, e=emf: n.solve(PLACE, s, e))
            for _ in range(REPEATS if boards > 8 else 2 * REPEATS)
        ]
        a_board[boards] = [t / boards for t in took]
        unit = f"board{'s' if boards > 1 else ''}"
        yield Row(f"thousand states a second, {boards} {unit}", [STATES / t / 1e3 for t in took], "{:.0f}")
    small = float(np.median(a_board[3]))
    yield Row("cost of a board, 30 boards / 3 boards", [t / small for t in a_board[30]], "{:.2f}", 2)
    thin = tree(30, thin=True)
    network, states, emf = Network(thin), sampled(thin, STATES, 1), healthy_emf(thin)
    took = [seconds(lambda: network.solve(PLACE, states, emf)) for _ in range(REPEATS)]
    yield Row("  the same, 30 boards overloaded (20 % drop)", [t / 30 / small for t in took], "{:.2f}")


def single_state() -> Iterator[Row]:
    """(d) Set-up of the network included."""
    for boards in (3, 30):
        made = tree(boards)
        states, emf = connected(made), healthy_emf(made)

        def work(made: Site = made, states=states, emf=emf) -> None:
            Network(made).solve(PLACE, states, emf)

        work()
        took = [1e3 * seconds(work) for _ in range(4 * REPEATS)]
        yield Row(f"one state with set-up, {boards} boards, ms", took, "{:.1f}", 20)


def stream() -> list[float]:
    """Peak memory [MB] of this process before streaming, after the first chunk, and after each fifth."""
    made = tree(30)
    network, emf = Network(made), healthy_emf(made)
    network.solve(PLACE, connected(made), emf)
    peaks = [_peak_mb()]
    marks = [CHUNK, *(k * STREAMED // 5 for k in range(1, 6))]
    highest = 0.0
    for first in range(0, STREAMED, CHUNK):
        last = min(first + CHUNK, STREAMED)
        solved = network.solve(PLACE, sampled(made, last - first, 1, start=first), emf)
        highest = max(highest, float(np.abs(solved.l_n).max()))
        peaks += [_peak_mb() for mark in marks if first < mark <= last]
    return peaks


def _peak_mb() -> float:
    status = Path("/proc/self/status")
    if status.exists():  # getrusage counts what the starting process held too
        return next(int(x.split()[1]) for x in status.read_text().splitlines() if x.startswith("VmHWM")) / 1024
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024


def memory() -> Iterator[Row]:
    """(e) In a process of its own, whose peak nothing else has raised."""
    with multiprocessing.get_context("spawn").Pool(1) as pool:
        before, first, *later = pool.apply(stream)
    name = f"memory streaming {STREAMED} states of 30 boards by {CHUNK}, MB"
    yield Row(f"{name}: peak above start", [p - before for p in later], "{:.0f}", 100, worst=True)
    yield Row("  of it after the first chunk", [p - first for p in later], "{:.0f}", worst=True)


def against_dense() -> Iterator[Row]:
    """(f) Every line, neutral and PE of every board; where the root finder rests elsewhere it starts from ours."""
    made, each = tree(3, earthed=True), 200 // REPEATS
    network, emf, dense = Network(made), healthy_emf(made), Dense(made, PLACE)
    worst, elsewhere = [], []
    for seed in range(REPEATS):
        states = sampled(made, each, seed)
        solved = network.solve(PLACE, states, emf)
        errors = []
        for state in range(each):
            error = _apart(dense, network, solved, emf, states, state, None)
            if error > 0.1:
                elsewhere.append(error)
                error = _apart(dense, network, solved, emf, states, state, _ours(dense, network, solved, emf, state))
            errors.append(error)
        worst.append(max(errors))
    yield Row("worst error against a dense solve, 200 states of 3 boards, V", worst, "{:.1e}", 1e-6, worst=True)
    yield Row("  states whose dense solve first came to rest elsewhere", [float(len(elsewhere))], "{:.0f}")


def _apart(dense: Dense, network: Network, solved, emf, states, state: int, start) -> float:
    unknowns = dense.solve(emf, states, state, start)
    if np.abs(dense.mismatch(unknowns, emf, states, state)).max() > 1e-8:
        return np.inf
    worst = 0.0
    for number, name in enumerate(network.boards):
        l_n, n_earth, _ = dense.board(unknowns, name)
        worst = max(worst, *np.abs(solved.l_n[number, :, state] - l_n), abs(solved.n_earth[number, state] - n_earth))
    return float(worst)


def _ours(dense: Dense, network: Network, solved, emf, state: int) -> np.ndarray:
    """The dense solve's unknowns, lines and neutrals of boards from our solution, the rest as at no load."""
    known = {n: emf[int(n[-1])] if n.startswith("source.L") else 0j for n in dense.nodes}
    for number, name in enumerate(network.boards):
        neutral = solved.n_earth[number, state]
        known[dense.root(f"{name}.N")] = neutral
        known |= {dense.root(f"{name}.L{k}"): solved.l_n[number, k, state] + neutral for k in range(3)}
    v = np.array([known[n] for n in dense.nodes])
    return np.concatenate([v.real, v.imag])


def unresolved() -> Iterator[Row]:
    """(g) Share not converged; and what flows to nowhere at the open neutral of states that are called converged."""
    for words, zip_p in (("ZIP 0.4/0.3/0.3", ZIP), ("ZIP 0.2/0.2/0.6", MOSTLY_POWER)):
        shares, lost = [], []
        made = tree(3, zip_p)
        made = replace(made, loads=tuple(replace(x, usage=0.5) for x in made.loads))  # islands may be nearly empty
        network, emf = Network(made), healthy_emf(made)
        at = [(network.boards.index(x.board), x.lines[0]) for x in made.loads]
        for seed in range(REPEATS):
            states = sampled(made, 5 * CHUNK, seed)
            solved = network.solve(PLACE, states, emf)
            volts = np.array([solved.l_n[b, k] for b, k in at])
            coefficients = [
                np.array([p - 1j * q for p, q in _powers(made, n)])[:, None] * states.loads / 230.0 ** (2 - n)
                for n in range(3)
            ]
            left = np.abs(plain(volts, *coefficients).sum(axis=0))
            held = states.loads.any(axis=0) & solved.converged  # an empty island hangs on the stated leak alone
            shares.append(float((~solved.converged).mean()))
            lost.append(float(left[held].max()))
        yield Row(f"share unresolved, 3 boards, {words}, 5 x {5 * CHUNK} states", shares, "{:.1e}", 1e-4, worst=True)
        yield Row("  current unaccounted for in converged states, A", lost, "{:.1e}", 1e-4, worst=True)
