"""A drawn site as an ngspice netlist: complex by ``.ac``, or doubled into coupled real parts and solved by ``.op``.

The doubled network has a node for the real and one for the imaginary part of every potential; each series admittance
G + jB is a resistor of 1 / G in either part and two voltage-controlled sources of B across the parts. A banded load is
a pair of behavioural current sources around the clipped voltage. Zero ohms are voltage sources of 0 V, hence exact.
"""

from collections.abc import Iterator

import numpy as np

from relaycfg.model.site import Load, Motor
from tests.reference.engines_drawing import EARTH, STAR, Consumer, Drawing, Wire

TINY_V2 = 1e-12
"""Square volts inside the root that measures a load's voltage, so that its slope exists at 0 V."""
STARTING = 2


def part(node: str, which: str = "") -> str:
    """A node's name in the netlist; ``which`` is r or i in the doubled network."""
    return "0" if node == EARTH else node.replace(".", "_") + which


def parts(drawing: Drawing, consumer: Consumer) -> Iterator[tuple[str, str, float, float]]:
    """Single-phase parts: from, to, nominal volts, share of the power."""
    item, nominal, lines = consumer.item, drawing.site.supply.nominal_v, consumer.nodes[: len(consumer.item.lines)]
    if item.to_neutral:
        yield from ((line, consumer.nodes[-1], nominal, 1 / len(lines)) for line in lines)
    elif len(lines) == 2:
        yield *lines, 3**0.5 * nominal, 1.0
    else:
        yield from ((lines[k], lines[k - 2], 3**0.5 * nominal, 1 / 3) for k in range(3))


def complex_netlist(drawing: Drawing, wires: list[Wire]) -> Iterator[str]:
    """Elements for ``.ac``. A consumer's susceptance is a capacitor (negative where it is inductive).

    A capacitor leaves the direct current alone, which an inductor across a source would not.
    """
    omega = 2 * np.pi * drawing.site.supply.frequency_hz
    for k, emf in enumerate(drawing.emf, start=1):
        yield f"ve{k} e{k} {part(STAR)} dc 0 ac {abs(emf):.17g} {np.angle(emf, deg=True):.17g}"
        wires = [*wires, Wire(f"e{k}", f"source.{k}", drawing.site.source.line_ohm)]
    for number, wire in enumerate(wires):
        start, end, between = part(wire.start), part(wire.end), f"w{number}"
        if wire.ohm.imag:
            yield f"l{number} {start} {between} {wire.ohm.imag / omega:.17g}"
            start = between
        yield f"r{number} {start} {end} {wire.ohm.real:.17g}" if wire.ohm.real else f"v{number} {start} {end} 0"
    for number, consumer in enumerate(drawing.consumers):
        for k, (start, end, nominal, share) in enumerate(parts(drawing, consumer)):
            siemens = share * consumer.factor * complex(consumer.item.p_w, -consumer.item.q_var) / nominal**2
            yield f"rl{number}_{k} {part(start)} {part(end)} {1 / siemens.real:.17g}"
            if siemens.imag:
                yield f"cl{number}_{k} {part(start)} {part(end)} {siemens.imag / omega:.17g}"


def doubled_netlist(drawing: Drawing, wires: list[Wire]) -> Iterator[str]:
    """Elements for ``.op``."""
    for k, emf in enumerate(drawing.emf, start=1):
        yield f"ve{k}r e{k}r {part(STAR, 'r')} {emf.real:.17g}"
        yield f"ve{k}i e{k}i {part(STAR, 'i')} {emf.imag:.17g}"
        wires = [*wires, Wire(f"e{k}", f"source.{k}", drawing.site.source.line_ohm)]
    for number, wire in enumerate(wires):
        for own, other, sign in (("r", "i", -1), ("i", "r", 1)):
            start, end = part(wire.start, own), part(wire.end, own)
            if not wire.ohm:
                yield f"v{number}{own} {start} {end} 0"
                continue
            siemens = 1 / wire.ohm
            if siemens.real:
                yield f"r{number}{own} {start} {end} {1 / siemens.real:.17g}"
            if siemens.imag:
                across = f"{part(wire.start, other)} {part(wire.end, other)}"
                yield f"g{number}{own} {start} {end} {across} {sign * siemens.imag:.17g}"
    for number, consumer in enumerate(drawing.consumers):
        if isinstance(consumer.item, Motor) and len(consumer.item.lines) == 3 and not consumer.item.to_neutral:
            yield from three_wire_motor(drawing, consumer, number)
            continue
        for k, piece in enumerate(parts(drawing, consumer)):
            yield from banded(consumer, f"{number}_{k}", *piece)


def banded(consumer: Consumer, name: str, start: str, end: str, nominal: float, share: float) -> Iterator[str]:
    """I = conj(S(m) / U) with m = |U| / nominal held inside the band: two current sources for Re and Im.

    A motor on a line is a constant impedance.
    """
    item = consumer.item
    real, imaginary = (f"v({part(start, p)},{part(end, p)})" for p in "ri")
    if isinstance(item, Load):
        m = f"v(m{name})"
        size = f"sqrt({real}*{real}+{imaginary}*{imaginary}+{TINY_V2})/{nominal:.17g}"
        yield f"bm{name} m{name} 0 v=max({item.band_low_pu:.17g},min({item.band_high_pu:.17g},{size}))"
        p, q = (
            f"{share * consumer.factor * watts / nominal**2:.17g}*({a:.17g}+{b:.17g}/{m}+{c:.17g}/({m}*{m}))"
            for watts, (a, b, c) in ((item.p_w, item.zip_p), (item.q_var, item.zip_q))
        )
    else:
        power = share * (item.starting_va if consumer.factor == STARTING else item.running_va) / nominal**2
        p, q = f"({power.real:.17g})", f"({power.imag:.17g})"
    yield f"bl{name}r {part(start, 'r')} {part(end, 'r')} i=({p})*{real}+({q})*{imaginary}"
    yield f"bl{name}i {part(start, 'i')} {part(end, 'i')} i=({p})*{imaginary}-({q})*{real}"


def three_wire_motor(drawing: Drawing, consumer: Consumer, number: int) -> Iterator[str]:
    """Admittances of positive and negative sequence between the three lines, as voltage-controlled sources.

    Running, the negative sequence meets the locked-rotor admittance (the package's stated approximation).
    """
    motor = consumer.item
    assert isinstance(motor, Motor)
    locked = motor.starting_va.conjugate()
    first = locked if consumer.factor == STARTING else motor.running_va.conjugate()
    turn = np.exp(1j * np.deg2rad(drawing.site.supply.geometry.angles_deg))
    for k, line in enumerate(consumer.nodes):
        for m, other in enumerate(consumer.nodes):
            positive, negative = turn[k] * turn[m].conjugate(), turn[k].conjugate() * turn[m]
            siemens = (first * positive + locked * negative) / (9 * drawing.site.supply.nominal_v**2)
            for to, of, value in (
                ("r", "r", siemens.real),
                ("r", "i", -siemens.imag),
                ("i", "r", siemens.imag),
                ("i", "i", siemens.real),
            ):
                yield f"gm{number}_{k}{m}{to}{of} {part(line, to)} 0 {part(other, of)} 0 {value:.17g}"
