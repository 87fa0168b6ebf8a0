"""An independent route: plain nodal equations of every node, loads from their power, a general root finder.

Shares nothing with the package but the site: admittances between named nodes, earth as reference, a break as a
missing (or longer) conductor. Needs line, neutral and link ohms other than zero, except where nodes are merged here.
"""

import numpy as np
from scipy.optimize import root

from relaycfg.model.site import Load, Motor, Site
from relaycfg.network import LoadStates

EARTH = "earth"


class Dense:
    """Nodal equations of a site with the neutral broken at ``place``."""

    def __init__(self, site: Site, place: str = "none", joint_ohm: float | None = None) -> None:
        self.site = site
        self.same: dict[str, str] = {}
        self.conductors: list[tuple[str, str, complex]] = []
        source = site.source
        for k in range(3):
            self.conductors.append((f"emf{k}", f"source.L{k}", source.line_ohm))
        if source.neutral_ohm == 0:
            self.merge("star", "star point")
        else:
            self.conductors.append(("star", "star point", source.neutral_ohm))
        self.neutral("star point", "source.N", source.star_link_ohm, place == "source", joint_ohm)
        earthed = "source.N" if source.earth_at == "neutral-bar" else "star point"
        self.conductors.append((earthed, EARTH, source.electrode_ohm or 1e6))
        with_pe = set()
        if site.supply.earthing != "TT":
            self.merge("source.PE", earthed)
            with_pe.add("source")
        for board in site.boards:
            name, up = board.name, board.fed_from
            if board.cable is None:
                for part in ("L0", "L1", "L2", "N", "PE"):
                    self.merge(f"{name}.{part}", f"{up}.{part}")
                if up in with_pe:
                    with_pe.add(name)
            else:
                for k in range(3):
                    self.conductors.append((f"{up}.L{k}", f"{name}.L{k}", board.cable.line_ohm))
                self.neutral(f"{up}.N", f"{name}.N", board.cable.neutral_ohm, place == name, joint_ohm)
                if board.cable.pe_ohm is not None and up in with_pe:
                    self.conductors.append((f"{up}.PE", f"{name}.PE", board.cable.pe_ohm))
                    with_pe.add(name)
            if board.neutral_earth_link:
                self.merge(f"{name}.PE", f"{name}.N")
                with_pe.add(name)
            if board.electrode_ohm is not None:
                self.conductors.append((f"{name}.PE", EARTH, board.electrode_ohm))
                with_pe.add(name)
        live = {self.root(f"{name}.PE") for name in with_pe}
        self.with_pe = {b.name for b in site.boards if self.root(f"{b.name}.PE") in live}
        names = {self.root(n) for a, b, _ in self.conductors for n in (a, b)} | {"star"}
        names |= {self.root(f"{b.name}.{part}") for b in site.boards for part in ("L0", "L1", "L2", "N")}
        emfs = {f"emf{k}" for k in range(3)}
        self.nodes = {n: k for k, n in enumerate(sorted(names - emfs - {EARTH}))}

    def root(self, name: str) -> str:
        while name in self.same:
            name = self.same[name]
        return name

    def merge(self, name: str, into: str) -> None:
        if self.root(name) != self.root(into):
            self.same[self.root(name)] = self.root(into)

    def neutral(self, up: str, down: str, ohm: complex, broken: bool, joint_ohm: float | None) -> None:
        if broken and joint_ohm is None:
            return
        total = ohm + (joint_ohm or 0.0 if broken else 0.0)
        if total == 0:
            self.merge(down, up)
        else:
            self.conductors.append((up, down, total))

    def volts(self, unknowns: np.ndarray, emf: np.ndarray) -> dict[str, complex]:
        """Potential of every node; EMF terminals follow the star."""
        v = unknowns[: len(self.nodes)] + 1j * unknowns[len(self.nodes) :]
        known = {n: v[k] for n, k in self.nodes.items()} | {EARTH: 0j}
        star = known[self.root("star")]
        return known | {f"emf{k}": star + emf[k] for k in range(3)}

    def leaving(self, known: dict[str, complex], states: LoadStates, state: int) -> dict[str, complex]:
        """Sum of currents [A] leaving every known node; conductors to unknown nodes are left out."""
        leaving = dict.fromkeys(known, 0j)
        for start, end, ohm in self.conductors:
            if self.root(start) in known and self.root(end) in known:
                current = (known[self.root(start)] - known[self.root(end)]) / ohm
                leaving[self.root(start)] += current
                leaving[self.root(end)] -= current
        for load, factor in zip(self.site.loads, states.loads[:, state], strict=True):
            self.add_load(leaving, known, load, factor)
        for motor, on in zip(self.site.motors, states.motors[:, state], strict=True):
            self.add_motor(leaving, known, motor, on)
        return leaving

    def mismatch(self, unknowns: np.ndarray, emf: np.ndarray, states: LoadStates, state: int) -> np.ndarray:
        """Sum of currents [A] leaving every node; zero at a solution."""
        leaving = self.leaving(self.volts(unknowns, emf), states, state)
        for k in range(3):  # what enters at an EMF terminal leaves at the star
            leaving[self.root("star")] += leaving[f"emf{k}"]
        sums = np.array([leaving[n] for n in self.nodes])
        return np.concatenate([sums.real, sums.imag])

    def branches(self, item: Load | Motor) -> list[tuple[str, str, float]]:
        """Single-phase parts of a load: from, to, nominal volts."""
        node = [self.root(f"{item.board}.{part}") for part in ("L0", "L1", "L2", "N")]
        nominal = self.site.supply.nominal_v
        if item.to_neutral:
            return [(node[k], node[3], nominal) for k in item.lines]
        if len(item.lines) == 2:
            i, j = item.lines
            return [(node[i], node[j], 3**0.5 * nominal)]
        return [(node[i], node[j], 3**0.5 * nominal) for i, j in ((0, 1), (1, 2), (2, 0))]

    def add_load(self, leaving: dict[str, complex], known: dict[str, complex], load: Load, factor: float) -> None:
        parts = self.branches(load)
        for start, end, nominal in parts:
            u = known[start] - known[end]
            m = min(max(abs(u) / nominal, load.band_low_pu), load.band_high_pu)
            p = load.p_w * (load.zip_p[0] * m * m + load.zip_p[1] * m + load.zip_p[2])
            q = load.q_var * (load.zip_q[0] * m * m + load.zip_q[1] * m + load.zip_q[2])
            current = factor / len(parts) * u * complex(p, -q) / (m * nominal) ** 2
            leaving[start] += current
            leaving[end] -= current

    def add_motor(self, leaving: dict[str, complex], known: dict[str, complex], motor: Motor, on: int) -> None:
        if on == 0:
            return
        running, starting = motor.running_va.conjugate(), motor.starting_va.conjugate()
        first = running if on == 1 else starting
        if motor.to_neutral or len(motor.lines) < 3:
            parts = self.branches(motor)
            for start, end, nominal in parts:
                current = (known[start] - known[end]) * first / len(parts) / nominal**2
                leaving[start] += current
                leaving[end] -= current
            return
        node = [self.root(f"{motor.board}.L{k}") for k in range(3)]
        v = np.array([known[n] for n in node])
        turn = self.site.supply.geometry.phasors
        square = 3 * self.site.supply.nominal_v**2
        positive, negative = (v * turn.conj()).mean(), (v * turn).mean()
        for k in range(3):
            leaving[node[k]] += (first * positive * turn[k] + starting * negative * turn[k].conj()) / square

    def solve(self, emf: np.ndarray, states: LoadStates, state: int, start: np.ndarray | None = None) -> np.ndarray:
        """Unknowns of one state, from a flat start or the given one; refined until the mismatch is rounding."""
        flat = np.zeros(2 * len(self.nodes))
        for n, k in self.nodes.items():
            for line in range(3):
                if n.endswith(f".L{line}"):
                    flat[k], flat[k + len(self.nodes)] = emf[line].real, emf[line].imag
        arguments = (emf, states, state)
        found = root(self.mismatch, flat if start is None else start, args=arguments, tol=1e-13).x
        for _ in range(4):
            residual = self.mismatch(found, *arguments)
            slope = np.array(
                [(self.mismatch(found + step, *arguments) - residual) / 1e-3 for step in 1e-3 * np.eye(len(found))]
            ).T
            found = found - np.linalg.solve(slope, residual)
        return found

    def board(self, unknowns: np.ndarray, emf: np.ndarray, name: str) -> tuple[np.ndarray, complex, complex]:
        """Line-to-neutral phasors, neutral to earth, PE to earth (nan without PE) of a board."""
        known = self.volts(unknowns, emf)
        n = known[self.root(f"{name}.N")]
        pe = known[self.root(f"{name}.PE")] if name in self.with_pe else complex(np.nan)
        return np.array([known[self.root(f"{name}.L{k}")] for k in range(3)]) - n, n, pe
