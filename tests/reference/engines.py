"""Random sites solved twice: by the package and by a general distribution power-flow engine, node by node.

Every conductor, neutral and PE included, is written out for the engine as an element of its own between named nodes:
series reactors for cables, links, electrodes and the joint, one voltage source a line behind the source's line
impedance, loads as the engine's own load models. Shared with the package are only the site and two stated figures of
its circuit: the leak and the link at the source's own bar. Every state is compared or counted under the reason
why not. ``python -m tests.reference.engines`` compares MANY networks and prints a table.

Not compared: motors (the engine has another law for three-wire ones), short circuits, loads of ZIP kind outside their
band (the engine does not continue the band's edge there; constant power is compared outside it too).
"""

import sys
from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass, field

import numpy as np
from dss import DSS as ENGINE

from relaycfg.model.site import NONE, SOURCE, Board, Load, Site
from relaycfg.network import Network, Solved, connected, healthy_emf, join, sampled
from relaycfg.network.circuit import LEAK_S, LINK_OHM
from tests.network.sites import board, cable, load, site

FEW, MANY = 60, 200
LIMIT_V = 0.01
"""Largest difference allowed at any node."""
SHORT_OHM = 1e-5
"""Stands for zero ohms: 100 A make 1 mV of it. Ten times less, and its rounding moves what only the leak ties to
earth (sites whose source has no electrode) by up to 8 mV; the engine solves one plain nodal matrix."""
JOINTS = (None, 0.1, 1.0, 10.0)
"""Joint resistances [ohm] tried at every break place; None is the open break."""
EARTHINGS = ("TN-S", "TN-C-S", "TT")
LAWS = ("impedance", "impedance", "power", "zip")
"""Load law of a network by seed; impedance twice as often."""
POLYNOMIALS = ((0.4, 0.4, 0.2), (0.0, 1.0, 0.0), (0.5, 0.0, 0.5), (0.2, 0.2, 0.6))
PLACES = ("L1", "L2", "L3", "L1", "L2", "L3", "L1-L2", "L2-L3", "L3-L1", "all", "star")
IMPEDANCE, POWER = (1.0, 0.0, 0.0), (0.0, 0.0, 1.0)
EARTH = "source.0"
BASE_V, BASE_KV_L_L = 230.0, 0.4
"""Only what the engine's per-unit figures refer to; without bases its convergence test stalls on small voltages."""
UNBALANCE = np.array([1.0, 0.98, 1.01])

WHATS = ("l_n", "n_earth", "pe_earth", "n_pe", "joint_v")

UNDEFINED = "node potentials to earth of sites without any electrode (undefined; all other volts compared)"
BEYOND_ZIP = "states with a ZIP load outside its band (the engine has another law there)"
ENGINE_LEFT = "states the engine's iteration left moving"
PACKAGE_LEFT = "states the package left moving"


def kind_of(seed: int) -> tuple[str, str]:
    """Earthing and load law of a seed's network."""
    return EARTHINGS[seed % 3], LAWS[seed // 3 % len(LAWS)]


def random_site(seed: int) -> Site:
    """One to eight boards with loads of every connection; some boards bare, some idle, some sources unearthed."""
    rng = np.random.default_rng(seed)
    earthing, law = kind_of(seed)
    names = [f"B{k}" for k in range(rng.integers(1, 9))]
    boards = []
    for k, name in enumerate(names):
        line = complex(rng.uniform(0.02, 0.25), rng.uniform(0.005, 0.08))
        pe = {"TN-S": True, "TN-C-S": k > 0, "TT": bool(rng.random() < 0.3)}[earthing]
        wire = cable(line, rng.uniform(1, 2) * line, pe=rng.uniform(1, 2) * line if pe else None)
        bare = k > 0 and rng.random() < 0.15
        link = (earthing == "TN-C-S" and k == 0) or rng.random() < 0.08
        electrode = float(rng.uniform(2, 200)) if rng.random() < 0.4 else None
        up = names[rng.integers(k)] if k else SOURCE
        boards.append(board(name, up, None if bare else wire, link=link, electrode=electrode))
    loads = [made for name in names if rng.random() < 0.85 for made in random_loads(rng, name, law)]
    return site(
        boards,
        loads or [load(names[0], "L1", 500.0)],
        emf_v=float(rng.uniform(230, 240)),
        line_ohm=complex(rng.uniform(0.005, 0.03), rng.uniform(0.01, 0.05)),
        neutral_ohm=complex(*[(0.0, 0.0), (-0.001, -0.003), (0.01, 0.02)][rng.integers(3)]),
        star_link_ohm=float(rng.choice([0.0, 1e-3])),
        electrode_ohm=float(rng.uniform(0.5, 30)) if rng.random() < 0.8 else None,
        earth_at=str(rng.choice(["neutral-bar", "star-point"])),
        earthing=earthing,
        phase_order=str(rng.choice(["L1-L2-L3", "L1-L3-L2"])),
    )


def random_loads(rng: np.random.Generator, name: str, law: str) -> Iterator[Load]:
    """One to five loads of a board; on a nonlinear site a constant impedance on every line as well."""
    if law != "impedance":
        for line in ("L1", "L2", "L3"):
            yield load(name, line, float(rng.uniform(200, 2000)))
    for _ in range(rng.integers(1, 6)):
        place = str(rng.choice(PLACES))
        power = float(rng.uniform(100, 3000 if law == "impedance" else 1000))
        polynomial = {"impedance": IMPEDANCE, "power": POWER, "zip": POLYNOMIALS[rng.integers(4)]}[law]
        yield load(
            name,
            "all" if place == "star" else place,
            power,
            power * float(rng.uniform(-0.3, 0.6)),
            zip_p=polynomial,
            zip_q=POLYNOMIALS[rng.integers(4)] if law == "zip" else polynomial,
            band=(float(rng.uniform(0.5, 0.8)), float(rng.uniform(1.15, 1.4))),
            usage=0.7,
            demand=0.9,
            to_neutral=place == "star" if place in ("all", "star") else None,
        )


@dataclass(frozen=True)
class Neutral:
    """A neutral that may break: its element, its ends (source's side first) and its own ohms."""

    element: str
    above: str
    below: str
    ohm: complex


class Drawing:
    """A site with one load state as the engine's commands; nodes are ``bus.number``.

    Numbers 1 to 3 are the lines, 4 the neutral, 5 PE, 0 remote earth; bus ``star`` has the star of the EMFs (1) and
    the star point (4). A load to neutral names both nodes: the engine would tie it to earth otherwise.
    """

    def __init__(self, made: Site, emf: np.ndarray, factors: np.ndarray) -> None:
        self.site = made
        self.commands: list[str] = []
        self.ties: dict[str, tuple[str, ...]] = {}
        """Nodes that an element holds by one another; the stated leak is not among them."""
        self.neutrals: dict[str, Neutral] = {}
        self.with_pe: set[str] = set()
        self._source(emf)
        for item in sorted(made.boards, key=lambda b: len(made.path(b.name))):
            self._board(item)
        for drawn, factor in zip(made.loads, factors, strict=True):
            if factor > 0:
                self._load(drawn, factor)

    def bus(self, name: str) -> str:
        """The bus a board sits on: its own, or without a cable its feeder's."""
        while name != SOURCE and self.site.board(name).cable is None:
            name = self.site.board(name).fed_from
        return name.lower()

    def held(self, place: str) -> bool:
        """Whether load, link or electrode holds the neutral behind an open break by the rest of the network."""
        neutral = self.neutrals[place]
        ties = [set(nodes) for element, nodes in self.ties.items() if element != neutral.element]
        group = {neutral.below}
        while more := set().union(*(nodes for nodes in ties if nodes & group)) - group:
            group |= more
        return "star.1" in group

    def _reactor(self, start: str, end: str, ohm: complex, tie: bool = True) -> str:
        ohm = complex(ohm) or complex(SHORT_OHM)
        element = f"reactor.r{len(self.commands)}"
        self.commands.append(f"new {element} phases=1 bus1={start} bus2={end} {in_ohms(ohm)}")
        if tie:
            self.ties[element] = (start, end)
        return element

    def _neutral(self, place: str, above: str, below: str, ohm: complex) -> None:
        self.neutrals[place] = Neutral(self._reactor(above, below, ohm), above, below, ohm)

    def _source(self, emf: np.ndarray) -> None:
        source = self.site.source
        ohm = f"[{source.line_ohm.real:.17g} {source.line_ohm.imag:.17g}]"
        for k, phasor in enumerate(emf, start=1):
            element = "circuit.site" if k == 1 else f"vsource.line{k}"
            self.commands.append(
                f"new {element} phases=1 bus1=source.{k} bus2=star.1 basekv={BASE_V / 1000} "
                f"pu={abs(phasor) / BASE_V:.17g} angle={np.angle(phasor, deg=True):.17g} z1={ohm} z0={ohm} z2={ohm}"
            )
            self.ties[element] = (f"source.{k}", "star.1")
        self._reactor("star.1", "star.4", source.neutral_ohm)
        self._neutral(SOURCE, "star.4", "source.4", source.star_link_ohm)
        earthed = "source.4" if source.earth_at == "neutral-bar" else "star.4"
        leak = source.electrode_ohm is None
        self._reactor(earthed, EARTH, 1 / LEAK_S if source.electrode_ohm is None else source.electrode_ohm, not leak)
        if self.site.supply.earthing != "TT":
            self._reactor(earthed, "source.5", 0)
            self.with_pe.add("source")

    def _board(self, item: Board) -> None:
        here, up = self.bus(item.name), self.bus(item.fed_from)
        if item.cable is not None:
            for k in (1, 2, 3):
                self._reactor(f"{up}.{k}", f"{here}.{k}", item.cable.line_ohm)
            self._neutral(item.name, f"{up}.4", f"{here}.4", item.cable.neutral_ohm)
            if item.cable.pe_ohm is not None and self._has_pe(up):
                self._reactor(f"{up}.5", f"{here}.5", item.cable.pe_ohm)
                self.with_pe.add(here)
        if item.neutral_earth_link:
            self._reactor(f"{here}.4", f"{here}.5", LINK_OHM if here == "source" else 0)
        if item.electrode_ohm is not None:
            self._reactor(f"{here}.5", EARTH, item.electrode_ohm)

    def _has_pe(self, bus: str) -> bool:
        """PE by a cable, or by link or electrode of any board on the bus."""
        own = (b for b in self.site.boards if self.bus(b.name) == bus)
        return bus in self.with_pe or any(b.neutral_earth_link or b.electrode_ohm is not None for b in own)

    def _load(self, item: Load, factor: float) -> None:
        """Constant impedance, constant power with the band's edges continued, or ZIP."""
        law = "model=2 vminpu=0 vmaxpu=10"
        if item.zip_p == item.zip_q == POWER:
            law = f"model=1 vminpu={item.band_low_pu:.17g} vmaxpu={item.band_high_pu:.17g}"
        elif (item.zip_p, item.zip_q) != (IMPEDANCE, IMPEDANCE):
            law = f"model=8 vminpu=0.01 vmaxpu=10 zipv=[{' '.join(map(str, (*item.zip_p, *item.zip_q, 0)))}]"
        here, nodes = self.bus(item.board), [k + 1 for k in item.lines] + [4] * item.to_neutral
        kilovolts = self.site.supply.nominal_v / 1000 * (1 if nodes[1:] == [4] else 3**0.5)
        element = f"load.l{len(self.commands)}"
        self.commands.append(
            f"new {element} bus1={here}.{'.'.join(map(str, nodes))} phases={3 if len(item.lines) == 3 else 1} "
            f"conn={'wye' if item.to_neutral else 'delta'} kv={kilovolts:.17g} "
            f"kw={item.p_w * factor / 1000:.17g} kvar={item.q_var * factor / 1000:.17g} vlowpu=0 {law}"
        )
        self.ties[element] = tuple(f"{here}.{node}" for node in nodes)


def in_ohms(ohm: complex) -> str:
    """Resistance and reactance as the engine reads them."""
    return f"R={ohm.real:.17g} X={ohm.imag:.17g}"


def command(*lines: str) -> None:
    """Hand lines to the engine; it raises on any that it does not understand."""
    for line in lines:
        ENGINE.Text.Command = line


def draw(drawing: Drawing) -> None:
    """Make the drawing the engine's circuit."""
    command("clear", "set defaultbasefrequency=50", *drawing.commands)
    command("set controlmode=off", "set maxiterations=2000", "set tolerance=1e-8", f"set voltagebases=[{BASE_KV_L_L}]")


def engine_volts(drawing: Drawing, place: str, joint_ohm: float | None) -> dict[str, complex] | None:
    """Potential of every node of the drawn circuit against earth with one neutral broken, then made whole again.

    None where the engine says that it has not converged. Each solution starts from the loadless circuit.
    """
    neutral = drawing.neutrals.get(place)
    if neutral is not None and joint_ohm is not None:
        command(f"edit {neutral.element} {in_ohms(neutral.ohm + joint_ohm)}")
    elif neutral is not None and drawing.held(place):
        command(f"edit {neutral.element} enabled=no")
    elif neutral is not None:
        command(f"edit {neutral.element} {in_ohms(1 / LEAK_S)}")
    command("calcvoltagebases", "solve")
    circuit = ENGINE.ActiveCircuit
    volts = None
    if circuit.Solution.Converged:
        phasors = np.asarray(circuit.AllBusVolts, float).view(complex)
        volts = dict(zip(circuit.AllNodeNames, phasors.tolist(), strict=True))
    if neutral is not None:
        command(f"edit {neutral.element} enabled=yes {in_ohms(neutral.ohm or complex(SHORT_OHM))}")
    return volts


@dataclass
class Tally:
    """What was compared of one or more networks, the worst differences [V], and what was not, by reason."""

    networks: int = 0
    states: int = 0
    open_states: int = 0
    beyond_band: int = 0
    """States compared with a constant-power load outside its band."""
    leak_held: int = 0
    """States compared where nothing but the stated leak holds the neutral behind an open break."""
    volts: int = 0
    """Phasors compared."""
    worst_v: dict[str, float] = field(default_factory=lambda: dict.fromkeys(WHATS, 0.0))
    left: Counter[str] = field(default_factory=Counter)
    apart: list[str] = field(default_factory=list)
    """States that differ by more than LIMIT_V."""

    def add(self, other: "Tally") -> None:
        """Take in another one."""
        for name in ("networks", "states", "open_states", "beyond_band", "leak_held", "volts", "left", "apart"):
            setattr(self, name, getattr(self, name) + getattr(other, name))
        self.worst_v = {name: max(worst, other.worst_v[name]) for name, worst in self.worst_v.items()}


def cases(made: Site) -> list[tuple[str, float | None]]:
    """The sound network, and every break place with every joint."""
    return [(NONE, 0.0), *((place, joint_ohm) for place in made.places for joint_ohm in JOINTS)]


def compare(seed: int) -> Tally:
    """One network in all cases, with everything connected and in one random load state."""
    made, tally = random_site(seed), Tally(networks=1)
    network, states, emf = Network(made), join(connected(made), sampled(made, 1, seed)), healthy_emf(made) * UNBALANCE
    solutions = {case: network.solve(case[0], states, emf, case[1]) for case in cases(made)}
    for state in range(states.count):
        drawing = Drawing(made, emf, states.loads[:, state])
        draw(drawing)
        for (place, joint_ohm), solved in solutions.items():
            beyond = bool(solved.below_band[state] or solved.above_band[state])
            if not solved.converged[state]:
                tally.left[PACKAGE_LEFT] += 1
            elif beyond and kind_of(seed)[1] == "zip":
                tally.left[BEYOND_ZIP] += 1
            elif (volts := engine_volts(drawing, place, joint_ohm)) is None:
                tally.left[ENGINE_LEFT] += 1
            else:
                tally.states += 1
                tally.open_states += joint_ohm is None
                tally.beyond_band += beyond
                tally.leak_held += joint_ohm is None and not drawing.held(place)
                where = f"network {seed} {kind_of(seed)}, break {place}, joint {joint_ohm}, state {state}"
                differences(tally, where, pairs(drawing, solved, state, volts, place, joint_ohm))
    return tally


def differences(tally: Tally, where: str, found: Iterator[tuple[str, complex, complex]]) -> None:
    """Enter the pairs of one state; what the package calls undefined is counted, nan against a number is not."""
    worst = 0.0
    for what, ours, theirs in found:
        if np.isnan(ours):
            tally.left[UNDEFINED] += 1
            continue
        tally.volts += 1
        off = abs(ours - theirs)
        worst = off if not off <= worst else worst  # nan of the engine counts as a difference
        tally.worst_v[what] = float(off if not off <= tally.worst_v[what] else tally.worst_v[what])
    if not worst <= LIMIT_V:
        tally.apart.append(f"{where}: {worst:.3g} V")


def pairs(
    drawing: Drawing, solved: Solved, state: int, volts: dict[str, complex], place: str, joint_ohm: float | None
) -> Iterator[tuple[str, complex, complex]]:
    """What is compared, the package's phasor and the engine's, of every board and the joint.

    Raises AssertionError where package and engine do not agree on which potentials exist.
    """
    site = drawing.site
    tied = site.source.electrode_ohm is not None or any(b.electrode_ohm is not None for b in site.boards)
    for number, item in enumerate(site.boards):
        here = drawing.bus(item.name)
        neutral, pe = volts[f"{here}.4"], volts.get(f"{here}.5")
        assert np.isnan(solved.n_pe[number, state]) == (pe is None), f"{item.name}: PE or none"
        assert np.isnan(solved.n_earth[number, state]) == (not tied), f"{item.name}: potential to earth or none"
        for k in range(3):
            yield "l_n", solved.l_n[number, k, state], volts[f"{here}.{k + 1}"] - neutral
        yield "n_earth", solved.n_earth[number, state], neutral
        if pe is not None:
            assert np.isnan(solved.pe_earth[number, state]) == (not tied), f"{item.name}: PE to earth or none"
            yield "n_pe", solved.n_pe[number, state], neutral - pe
            yield "pe_earth", solved.pe_earth[number, state], pe
    if place != NONE:
        broken = drawing.neutrals[place]
        share = 1.0 if joint_ohm is None else joint_ohm / (broken.ohm + joint_ohm)
        yield "joint_v", solved.joint_v[state], share * (volts[broken.below] - volts[broken.above])


def main() -> int:
    """Compare MANY networks and print what was compared and what not; 1 where anything is apart or left moving."""
    kinds: dict[tuple[str, str], Tally] = {}
    for seed in range(MANY):
        kinds.setdefault(kind_of(seed), Tally()).add(compare(seed))
    total = Tally()
    columns = ("networks", "states", "open_states", "beyond_band", "leak_held", "volts")
    print(f"{'earthing':9}{'loads':11}" + "".join(f"{name:>13}" for name in (*columns, *(f"{w} mV" for w in WHATS))))
    for kind, tally in sorted(kinds.items()):
        total.add(tally)
        print(row(kind, [getattr(tally, name) for name in columns], tally))
    print(row(("all", ""), [getattr(total, name) for name in columns], total))
    print("worst differences in mV; limit", 1000 * LIMIT_V, "mV")
    for reason, count in total.left.items():
        print(f"not compared: {count} {reason}")
    for line in total.apart:
        print("apart:", line)
    return int(bool(total.apart) or any(total.left[reason] for reason in (ENGINE_LEFT, PACKAGE_LEFT)))


def row(kind: tuple[str, str], counts: list[int], tally: Tally) -> str:
    """One line of the table."""
    worst = "".join(f"{1000 * tally.worst_v[what]:13.4f}" for what in WHATS)
    return f"{kind[0]:9}{kind[1]:11}" + "".join(f"{count:13d}" for count in counts) + worst


if __name__ == "__main__":
    sys.exit(main())
