"""The same circuit in the same run: a general distribution power-flow engine against the package."""

from collections.abc import Iterator

import numpy as np
from dss import DSS as ENGINE

from relaycfg.network import Network, healthy_emf, sampled
from tests.benchmarks.report import REPEATS, Row, seconds
from tests.network.sites import board, cable, load, site
from tests.reference.engines_drawing import Drawing
from tests.reference.engines_dss import command, draw, reactor

STATES = 20_000
BOARD = "Main"
ZIP, BAND = (0.4, 0.3, 0.3), (0.1, 1.8)
"""A band that no state leaves: outside it that engine has another law."""
APART_V = 0.01


def measure() -> Iterator[Row]:
    """Nine loads behind an open neutral; every load of the engine follows a shape of its own, solved in one call.

    Electrodes on both sides hold the neutral: without them the engine, which keeps each load's admittance at its
    rating, does not converge on shapes that switch loads off. The fastest way found: its own loop, no monitor.
    """
    loads = [
        load(BOARD, f"L{1 + k % 3}", 900.0 + 150 * k, 200.0, name=f"load {k}", zip_p=ZIP, band=BAND, usage=0.8)
        for k in range(9)
    ]
    always = [load(BOARD, f"L{k}", 500.0, 0.0, name=f"always {k}", zip_p=ZIP, band=BAND) for k in (1, 2, 3)]
    made = site(
        [board(BOARD, cable=cable(0.05 + 0.01j), link=True, electrode=2.0)],
        [*always, *loads[3:]],
        emf_v=235.0,
        line_ohm=0.01 + 0.02j,
        electrode_ohm=1.0,
    )
    network, states, emf = Network(made), sampled(made, STATES, 1), healthy_emf(made)
    drawing = Drawing(made, emf, np.ones(len(made.loads)))
    draw(drawing)
    for k, factors in enumerate(states.loads):
        command(f"new loadshape.s{k} npts={STATES} interval=1 useactual=no")
        ENGINE.ActiveCircuit.LoadShapes.Name = f"s{k}"
        ENGINE.ActiveCircuit.LoadShapes.Pmult = factors
        ENGINE.ActiveCircuit.LoadShapes.Qmult = factors
        command(f"edit load.l{k} yearly=s{k}")
    command(f"edit {reactor(drawing.neutrals[BOARD].wire)} enabled=no", "calcvoltagebases")
    command("set tolerance=1e-6", "set mode=yearly stepsize=1h")

    def solve_all() -> None:
        command("set hour=0 sec=0", f"set number={STATES}", "solve")

    ratio, ours = [], []
    for _ in range(REPEATS):
        theirs = seconds(solve_all)
        mine = seconds(lambda: network.solve(BOARD, states, emf))
        ratio.append(theirs / mine)
        ours.append(theirs)
    phasors = np.asarray(ENGINE.ActiveCircuit.AllBusVolts, float).view(complex)
    volts = dict(zip(ENGINE.ActiveCircuit.AllNodeNames, phasors.tolist(), strict=True))
    bus = drawing.bus(BOARD).lower()
    theirs_v = np.array([volts[f"{bus}.{k}"] - volts[f"{bus}.4"] for k in (1, 2, 3)])
    apart = float(np.abs(theirs_v - network.solve(BOARD, states, emf).l_n[0, :, -1]).max())
    yield Row("general power-flow engine, all states in one call / solve, 9 loads, 1 board", ratio, "{:.0f}", least=10)
    yield Row("  its thousand states a second", [STATES / t / 1e3 for t in ours], "{:.0f}")
    yield Row("  last state apart, V", [apart], "{:.4f}", APART_V, worst=True)
