"""An independent route: plain nodal equations of every node, loads from their power, a general root finder.

Shares nothing with the package but the site and its two stated figures (leak, link at the source's bar): admittances
between named nodes, earth as reference, a break as a missing (or longer) conductor. Three lines; line and electrode
ohms other than zero; zero ohms elsewhere merge nodes.
"""

from functools import cached_property

import numpy as np
from scipy.optimize import root

from relaycfg.model.site import SOURCE, Board, Load, Motor, Site
from relaycfg.network import LoadStates
from relaycfg.network.circuit import LEAK_S, LINK_OHM

EARTH = "earth"
STEP_V = 1e-3
"""Half-width of the differences that give a load's slope."""
REFINEMENTS = 4
LINES = range(3)


class Dense:
    """Nodal equations of a site with the neutral broken at ``place``; unknowns are Re, then Im of ``nodes`` [V]."""

    def __init__(self, site: Site, place: str = "none", joint_ohm: float | None = None) -> None:
        self.site = site
        self.same: dict[str, str] = {}
        self.conductors: list[tuple[str, str, complex]] = []
        self.broken: tuple[str, str] | None = None
        """Neutral on the source's side and on the board's side of the joint."""
        self._source(place, joint_ohm)
        for board in site.boards:
            if board.cable is None:
                for part in ("L0", "L1", "L2", "N", "PE"):
                    self.merge(f"{board.name}.{part}", f"{self.bus(board.name)}.{part}")
        cabled = sorted((b for b in site.boards if b.cable is not None), key=lambda b: len(site.path(b.name)))
        with_pe = {SOURCE} if site.supply.earthing != "TT" else set()
        self._earth(SOURCE, with_pe)
        for board in cabled:
            self._cable(board, with_pe, board.name == place, joint_ohm)
        self.with_pe = {b.name for b in site.boards if self.bus(b.name) in with_pe}
        names = {self.root(n) for a, b, _ in self.conductors for n in (a, b)} | {"star"}
        names |= {self.root(f"{b.name}.{part}") for b in site.boards for part in ("L0", "L1", "L2", "N")}
        self.nodes = {n: k for k, n in enumerate(sorted(names - {EARTH}))}
        self._extras: dict[tuple[bytes, bytes], np.ndarray] = {}
        self._loads = [
            (number, *branch) for number, item in enumerate(site.loads) for branch in self.branches(item)
        ]  # load, from, to, nominal volts, share

    def _source(self, place: str, joint_ohm: float | None) -> None:
        source = self.site.source
        for k in LINES:
            self.conductors.append(("star", f"source.L{k}", source.line_ohm))  # the EMFs stand in these three
        self.series("star point", "star", source.neutral_ohm)
        self.neutral("star point", "source.N", source.star_link_ohm, place == SOURCE, joint_ohm)
        earthed = "source.N" if source.earth_at == "neutral-bar" else "star point"
        self.conductors.append((earthed, EARTH, 1 / LEAK_S if source.electrode_ohm is None else source.electrode_ohm))
        if self.site.supply.earthing != "TT":
            self.merge("source.PE", earthed)

    def _cable(self, board: Board, with_pe: set[str], broken: bool, joint_ohm: float | None) -> None:
        name, up, cable = board.name, self.bus(board.fed_from), board.cable
        assert cable is not None
        for k in LINES:
            self.series(f"{up}.L{k}", f"{name}.L{k}", cable.line_ohm)
        self.neutral(f"{up}.N", f"{name}.N", cable.neutral_ohm, broken, joint_ohm)
        if cable.pe_ohm is not None and up in with_pe:
            self.series(f"{up}.PE", f"{name}.PE", cable.pe_ohm)
            with_pe.add(name)
        self._earth(name, with_pe)

    def _earth(self, bus: str, with_pe: set[str]) -> None:
        """Links and electrodes of all boards on a bus."""
        for board in self.site.boards:
            if self.bus(board.name) != bus or (board.electrode_ohm is None and not board.neutral_earth_link):
                continue
            with_pe.add(bus)
            if board.electrode_ohm is not None:
                self.series(f"{bus}.PE", EARTH, board.electrode_ohm)
            if board.neutral_earth_link:
                self.series(f"{bus}.PE", f"{bus}.N", LINK_OHM if bus == SOURCE else 0)

    def bus(self, name: str) -> str:
        """The board with a cable (or the source) whose nodes ``name`` shares."""
        while name != SOURCE and self.site.board(name).cable is None:
            name = self.site.board(name).fed_from
        return name

    def root(self, name: str) -> str:
        """The node that ``name`` was merged into."""
        while name in self.same:
            name = self.same[name]
        return name

    def merge(self, name: str, into: str) -> None:
        if self.root(name) != self.root(into):
            self.same[self.root(name)] = self.root(into)

    def series(self, start: str, end: str, ohm: complex) -> None:
        if ohm == 0:
            self.merge(start, end)
        else:
            self.conductors.append((start, end, ohm))

    def neutral(self, up: str, down: str, ohm: complex, broken: bool, joint_ohm: float | None) -> None:
        if broken:
            self.broken = (up, down)
        if not broken or joint_ohm is not None:
            self.series(down, up, ohm + (joint_ohm or 0.0 if broken else 0.0))

    def branches(self, item: Load | Motor) -> list[tuple[str, str, float, float]]:
        """Single-phase parts of a load: from, to, nominal volts, share of its power."""
        node = [self.root(f"{item.board}.{part}") for part in ("L0", "L1", "L2", "N")]
        nominal = self.site.supply.nominal_v
        if item.to_neutral:
            return [(node[k], node[3], nominal, 1 / len(item.lines)) for k in item.lines]
        pairs = [item.lines] if len(item.lines) == 2 else [(0, 1), (1, 2), (2, 0)]
        return [(node[i], node[j], 3**0.5 * nominal, 1 / len(pairs)) for i, j in pairs]

    @cached_property
    def _ends(self) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        """Conductors as arrays: from, to (earth is the place after the last node), ohms."""
        place = self.nodes | {EARTH: len(self.nodes)}
        ends = np.array([[place[self.root(n)] for n in (a, b)] for a, b, _ in self.conductors])
        return ends[:, 0], ends[:, 1], np.array([ohm for *_, ohm in self.conductors])

    @cached_property
    def _conducting(self) -> np.ndarray:
        """Admittances [nodes + 1, nodes + 1] of all conductors."""
        matrix = np.zeros((len(self.nodes) + 1, len(self.nodes) + 1), complex)
        start, end, ohm = self._ends
        stamp(matrix, start, end, 1 / ohm)
        return matrix

    @cached_property
    def _parts(self) -> tuple[np.ndarray, ...]:
        """Parts of loads as arrays: load, from, to, nominal volts, P and Q [parts], their polynomials [3, parts]."""
        numbers = np.array([part[0] for part in self._loads], int)
        ends = np.array([[self.nodes[part[1]], self.nodes[part[2]]] for part in self._loads], int).reshape(-1, 2)
        loads = [self.site.loads[number] for number in numbers]
        share = np.array([part[4] for part in self._loads])
        p, q = share * [x.p_w for x in loads], share * [x.q_var for x in loads]
        zips = [np.array([getattr(x, name) for x in loads]).reshape(-1, 3).T for name in ("zip_p", "zip_q")]
        band = np.array([(x.band_low_pu, x.band_high_pu) for x in loads]).reshape(-1, 2)
        return numbers, *ends.T, np.array([part[3] for part in self._loads]), p, q, *zips, *band.T

    def load_current(self, u: np.ndarray, factors: np.ndarray) -> np.ndarray:
        """Current of every part of a load at voltages u [parts]: I = conj(S / U), the band's edges continued."""
        numbers, _, _, nominal, p, q, zip_p, zip_q, low, high = self._parts
        m = np.clip(np.abs(u) / nominal, low, high)
        powers = np.array([m * m, m, np.ones_like(m)])
        power = p * (zip_p * powers).sum(axis=0) + 1j * q * (zip_q * powers).sum(axis=0)
        current: np.ndarray = factors[numbers] * u * power.conj() / (m * nominal) ** 2
        return current

    def extra(self, states: LoadStates, state: int) -> np.ndarray:
        """Admittances [nodes + 1, nodes + 1] of motors, and the stated leak where nothing holds a broken neutral."""
        key = (states.loads[:, state].tobytes(), states.motors[:, state].tobytes())
        if key not in self._extras:
            self._extras[key] = self._extra(states, state)
        return self._extras[key]

    def _extra(self, states: LoadStates, state: int) -> np.ndarray:
        place = self.nodes | {EARTH: len(self.nodes)}
        matrix = np.zeros((len(place), len(place)), complex)
        for motor, on in zip(self.site.motors, states.motors[:, state], strict=True):
            if on:
                self._motor(matrix, motor, (motor.running_va if on == 1 else motor.starting_va).conjugate())
        if self.broken and not self._held(states, state):
            above, below = (place[self.root(n)] for n in self.broken)
            stamp(matrix, above, below, LEAK_S)
        return matrix

    def _motor(self, matrix: np.ndarray, motor: Motor, first: complex) -> None:
        if motor.to_neutral or len(motor.lines) < 3:
            for start, end, nominal, share in self.branches(motor):
                stamp(matrix, self.nodes[start], self.nodes[end], share * first / nominal**2)
            return
        lines = [self.nodes[self.root(f"{motor.board}.L{k}")] for k in LINES]
        turn = self.site.supply.geometry.phasors
        positive, negative = np.outer(turn, turn.conj()) / 3, np.outer(turn.conj(), turn) / 3
        second = motor.starting_va.conjugate()
        square = 3 * self.site.supply.nominal_v**2
        matrix[np.ix_(lines, lines)] += (first * positive + second * negative) / square

    def _held(self, states: LoadStates, state: int) -> bool:
        """Whether conductors, loads or motors tie the neutral behind the joint to the star."""
        assert self.broken is not None
        ties = [{self.root(a), self.root(b)} for a, b, _ in self.conductors]
        ties += [{start, end} for number, start, end, *_ in self._loads if states.loads[number, state] > 0]
        for motor, on in zip(self.site.motors, states.motors[:, state], strict=True):
            ties += [{start, end} for start, end, *_ in self.branches(motor) if on]
        group = {self.root(self.broken[1])}
        while more := set().union(*(tie for tie in ties if tie & group)) - group:
            group |= more
        return "star" in {self.root(n) for n in group} or self.root("star") in group

    def leaving(self, v: np.ndarray, emf: np.ndarray, states: LoadStates, state: int) -> np.ndarray:
        """Sum of currents [A] leaving every node at potentials v [nodes]; nan only at neighbours of nan."""
        v, count = np.append(v, 0), len(self.nodes)
        start, end, ohm = self._ends
        across = v[start] - v[end]
        across[:3] += emf
        sums = np.zeros(count + 1, complex)
        _, first, second, *_ = self._parts
        load = self.load_current(v[first] - v[second], states.loads[:, state])
        for plus, minus, current in ((start, end, across / ohm), (first, second, load)):
            np.add.at(sums, plus, current)
            np.add.at(sums, minus, -current)
        extra = self.extra(states, state)
        rows = np.flatnonzero(np.abs(extra).sum(axis=1))
        sums[rows] += extra[np.ix_(rows, rows)] @ v[rows]
        return sums[:count]

    def mismatch(self, unknowns: np.ndarray, emf: np.ndarray, states: LoadStates, state: int) -> np.ndarray:
        """Sum of currents [A] leaving every node, Re then Im; zero at a solution."""
        sums = self.leaving(self.potentials(unknowns), emf, states, state)
        return np.concatenate([sums.real, sums.imag])

    def jacobian(self, unknowns: np.ndarray, states: LoadStates, state: int) -> np.ndarray:
        """Slope of ``mismatch`` (the EMFs do not enter it); that of the loads by central differences."""
        count = len(self.nodes)
        v = np.append(self.potentials(unknowns), 0)
        linear = self._conducting + self.extra(states, state)
        by_re, by_im = linear.copy(), 1j * linear
        _, first, second, *_ = self._parts
        u, factors = v[first] - v[second], states.loads[:, state]
        for matrix, step in ((by_re, STEP_V), (by_im, 1j * STEP_V)):
            slope = (self.load_current(u + step, factors) - self.load_current(u - step, factors)) / (2 * STEP_V)
            stamp(matrix, first, second, slope)
        by_re, by_im = by_re[:count, :count], by_im[:count, :count]
        return np.block([[by_re.real, by_im.real], [by_re.imag, by_im.imag]])

    def potentials(self, unknowns: np.ndarray) -> np.ndarray:
        """Potentials [nodes]."""
        v: np.ndarray = unknowns[: len(self.nodes)] + 1j * unknowns[len(self.nodes) :]
        return v

    def flat(self, emf: np.ndarray) -> np.ndarray:
        """Every line at its EMF, everything else at earth."""
        v = np.array([emf[int(n[-1])] if n[-3:-1] == ".L" else 0 for n in self.nodes], complex)
        return np.concatenate([v.real, v.imag])

    def solve(self, emf: np.ndarray, states: LoadStates, state: int, start: np.ndarray | None = None) -> np.ndarray:
        """Unknowns of one state, from a flat start or the given one; refined until the mismatch is rounding."""

        def mismatch(x: np.ndarray) -> np.ndarray:
            return self.mismatch(x, emf, states, state)

        def slope(x: np.ndarray) -> np.ndarray:
            return self.jacobian(x, states, state)

        found: np.ndarray = root(mismatch, self.flat(emf) if start is None else start, jac=slope, tol=1e-13).x
        for _ in range(REFINEMENTS):
            found = found - np.linalg.solve(slope(found), mismatch(found))
        return found

    def board(self, unknowns: np.ndarray, name: str) -> tuple[np.ndarray, complex, complex]:
        """Line-to-neutral phasors, neutral to earth, PE to earth (nan without PE) of a board."""
        v = self.potentials(unknowns)
        n = v[self.nodes[self.root(f"{name}.N")]]
        pe = v[self.nodes[self.root(f"{name}.PE")]] if name in self.with_pe else complex(np.nan)
        return np.array([v[self.nodes[self.root(f"{name}.L{k}")]] for k in LINES]) - n, n, pe


def stamp(matrix: np.ndarray, start: int | np.ndarray, end: int | np.ndarray, siemens: complex | np.ndarray) -> None:
    """Add admittances between nodes to a nodal matrix."""
    start, end = np.asarray(start), np.asarray(end)
    for rows, columns, sign in ((start, start, 1), (end, end, 1), (start, end, -1), (end, start, -1)):
        np.add.at(matrix, (rows, columns), sign * siemens)
