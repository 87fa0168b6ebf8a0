"""A drawn site handed to a general distribution power-flow engine, and the volts it finds.

Series reactors for cables, links, electrodes and the joint, one voltage source a line behind the source's line
impedance, loads as the engine's own load models. A load to neutral names both nodes: the engine would tie it to earth
otherwise. It has no law of the package's kind for three-wire motors nor for a ZIP load outside its band.
"""

import numpy as np
from dss import DSS as ENGINE

from relaycfg.model.site import Load
from tests.reference.engines_drawing import STAR, Consumer, Drawing
from tests.reference.engines_sites import IMPEDANCE, POWER

SHORT_OHM = 1e-5
"""Stands for zero ohms: 100 A make 1 mV of it. Ten times less, and its rounding moves what only the leak ties to
earth (sites whose source has no electrode) by up to 8 mV; the engine solves one plain nodal matrix."""
BASE_V, BASE_KV_L_L = 230.0, 0.4
"""Only what the engine's per-unit figures refer to; without bases its convergence test stalls on small voltages."""


def draw(drawing: Drawing) -> None:
    """Make the drawing the engine's circuit."""
    command("clear", "set defaultbasefrequency=50")
    line = drawing.site.source.line_ohm
    ohm = f"[{line.real:.17g} {line.imag:.17g}]"
    for k, phasor in enumerate(drawing.emf, start=1):
        element = "circuit.site" if k == 1 else f"vsource.line{k}"
        command(
            f"new {element} phases=1 bus1=source.{k} bus2={STAR} basekv={BASE_V / 1000} "
            f"pu={abs(phasor) / BASE_V:.17g} angle={np.angle(phasor, deg=True):.17g} z1={ohm} z0={ohm} z2={ohm}"
        )
    for number, wire in enumerate(drawing.wires):
        command(f"new {reactor(number)} phases=1 bus1={wire.start} bus2={wire.end} {in_ohms(wire.ohm)}")
    for number, consumer in enumerate(drawing.consumers):
        command(load_command(drawing, consumer, number))
    command("set controlmode=off", "set maxiterations=2000", "set tolerance=1e-8", f"set voltagebases=[{BASE_KV_L_L}]")


def load_command(drawing: Drawing, consumer: Consumer, number: int) -> str:
    """Constant impedance, constant power with the band's edges continued, or ZIP."""
    item, factor = consumer.item, consumer.factor
    assert isinstance(item, Load), "the engine has another law for motors"
    law = "model=2 vminpu=0 vmaxpu=10"
    if item.zip_p == item.zip_q == POWER:
        law = f"model=1 vminpu={item.band_low_pu:.17g} vmaxpu={item.band_high_pu:.17g}"
    elif (item.zip_p, item.zip_q) != (IMPEDANCE, IMPEDANCE):
        law = f"model=8 vminpu=0.01 vmaxpu=10 zipv=[{' '.join(map(str, (*item.zip_p, *item.zip_q, 0)))}]"
    nodes = ".".join(node.rpartition(".")[2] for node in consumer.nodes)
    kilovolts = drawing.site.supply.nominal_v / 1000 * (1 if item.to_neutral and len(item.lines) == 1 else 3**0.5)
    return (
        f"new load.l{number} bus1={consumer.bus}.{nodes} phases={3 if len(item.lines) == 3 else 1} "
        f"conn={'wye' if item.to_neutral else 'delta'} kv={kilovolts:.17g} "
        f"kw={item.p_w * factor / 1000:.17g} kvar={item.q_var * factor / 1000:.17g} vlowpu=0 {law}"
    )


def engine_volts(drawing: Drawing, place: str, joint_ohm: float | None) -> dict[str, complex] | None:
    """Potential of every node of the drawn circuit against earth with one neutral broken, then made whole again.

    None where the engine says that it has not converged. Each solution starts from the loadless circuit.
    """
    neutral = drawing.neutrals.get(place)
    if neutral is not None:
        ohm = drawing.broken_ohm(place, joint_ohm)
        command(f"edit {reactor(neutral.wire)} {'enabled=no' if ohm is None else in_ohms(ohm)}")
    command("calcvoltagebases", "solve")
    circuit = ENGINE.ActiveCircuit
    volts = None
    if circuit.Solution.Converged:
        phasors = np.asarray(circuit.AllBusVolts, float).view(complex)
        volts = dict(zip(circuit.AllNodeNames, phasors.tolist(), strict=True))
    if neutral is not None:
        command(f"edit {reactor(neutral.wire)} enabled=yes {in_ohms(neutral.ohm)}")
    return volts


def reactor(number: int) -> str:
    """The engine's name of a wire."""
    return f"reactor.r{number}"


def in_ohms(ohm: complex) -> str:
    """Resistance and reactance as the engine reads them."""
    ohm = ohm or complex(SHORT_OHM)
    return f"R={ohm.real:.17g} X={ohm.imag:.17g}"


def command(*lines: str) -> None:
    """Hand lines to the engine; it raises on any that it does not understand."""
    for line in lines:
        ENGINE.Text.Command = line
