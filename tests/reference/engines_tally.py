"""What a comparison with another engine has compared, how far apart it was, and what it left out by reason."""

from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass, field, fields

import numpy as np

from relaycfg.model.site import NONE
from relaycfg.network import LoadStates, Network, Solved
from tests.network.dense import Dense
from tests.reference.engines_dense import RESIDUAL_A, difference
from tests.reference.engines_drawing import Drawing
from tests.reference.roots_at_rest import filled, from_engine, from_package, stability, way_to_rest

LIMIT_V = 0.01
"""Largest difference allowed at any node."""
ROOT_LIMIT_V = 1e-6
"""How near the package's answer has to be to a root of the dense equations."""
WHATS = ("l_n", "n_earth", "pe_earth", "n_pe", "joint_v")

UNDEFINED = "node potentials to earth of sites without any electrode (undefined; all other volts compared)"
BEYOND_ZIP = "states with a ZIP load outside its band (this engine has another law there)"
ENGINE_LEFT = "states the engine's iteration left moving (the package's answer is a stable root or called unstable)"
PACKAGE_LEFT = "states the package left moving and says so"


@dataclass
class Tally:
    """What was compared of one or more networks, the worst differences [V], and what was not, by reason."""

    networks: int = 0
    states: int = 0
    """States whose every voltage was compared."""
    open_states: int = 0
    beyond_band: int = 0
    """States compared with a load outside its band."""
    leak_held: int = 0
    """States compared where nothing but the stated leak holds the neutral behind an open break."""
    volts: int = 0
    """Phasors compared."""
    worst_v: dict[str, float] = field(default_factory=lambda: dict.fromkeys(WHATS, 0.0))
    other_root: int = 0
    """States in which engine and package rest on two different roots of the same equations (not in ``states``)."""
    other_root_said: int = 0
    """Those of them that the package calls unstable or of several solutions."""
    left: Counter[str] = field(default_factory=Counter)
    apart: list[str] = field(default_factory=list)
    """States that differ by more than LIMIT_V without being two roots."""

    def add(self, other: "Tally") -> None:
        """Take in another one."""
        worst = {name: max(value, other.worst_v[name]) for name, value in self.worst_v.items()}
        for name in (f.name for f in fields(self) if f.name != "worst_v"):
            setattr(self, name, getattr(self, name) + getattr(other, name))
        self.worst_v = worst

    @property
    def worst(self) -> float:
        """The worst difference of all; infinite while something is apart."""
        return float("inf") if self.apart else max(self.worst_v.values())

    @property
    def unanswered(self) -> int:
        """States to which package or engine gave no answer."""
        return self.left[PACKAGE_LEFT] + self.left[ENGINE_LEFT]

    @property
    def note(self) -> str:
        """What was compared and what was not, in words."""
        words = f"{self.networks} networks, {self.states} states ({self.open_states} open), {self.volts} phasors; "
        words += f"matched by root: {self.other_root}"
        words += f" ({self.other_root_said} of them said to be unstable or several)" * bool(self.other_root)
        left = "".join(f"; not compared: {count} {reason}" for reason, count in sorted(self.left.items()))
        return words + left + "".join(f"; APART: {line}" for line in self.apart)


@dataclass(frozen=True)
class Answer:
    """The package's answer to one state of one case, with what is needed to judge another one by it."""

    drawing: Drawing
    network: Network
    solved: Solved
    states: LoadStates
    state: int
    place: str
    joint_ohm: float | None

    @property
    def beyond(self) -> bool:
        """Whether a load lies outside its band."""
        return bool(self.solved.below_band[self.state] or self.solved.above_band[self.state])

    def pairs(self, volts: dict[str, complex]) -> Iterator[tuple[str, complex, complex]]:
        """What is compared, the package's phasor and the engine's, of every board and the joint.

        Raises AssertionError where package and engine do not agree on which potentials exist.
        """
        site, solved, state = self.drawing.site, self.solved, self.state
        tied = site.source.electrode_ohm is not None or any(b.electrode_ohm is not None for b in site.boards)
        for number, item in enumerate(site.boards):
            here = self.drawing.bus(item.name)
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
        if self.place != NONE:
            broken = self.drawing.neutrals[self.place]
            share = 1.0 if self.joint_ohm is None else self.joint_ohm / (broken.ohm + self.joint_ohm)
            yield "joint_v", solved.joint_v[state], share * (volts[broken.below] - volts[broken.above])

    def enter(self, tally: Tally, volts: dict[str, complex] | None, where: str) -> None:
        """Compare with an engine's volts (None: it did not converge) and count, always under exactly one head."""
        if not self.solved.converged[self.state]:
            tally.left[PACKAGE_LEFT] += 1
            return
        where = f"{where}, break {self.place}, joint {self.joint_ohm}, state {self.state}"
        if volts is None:
            if self.rests():
                tally.left[ENGINE_LEFT] += 1
            else:
                tally.apart.append(f"{where}: no answer of the engine, and the package's is no root")
            return
        off, undefined = {what: [0.0] for what in WHATS}, 0
        for what, ours, theirs in self.pairs(volts):
            if np.isnan(ours):  # the package calls it undefined; an engine's nan against a number counts as apart
                undefined += 1
            else:
                off[what].append(float(np.nan_to_num(abs(ours - theirs), nan=np.inf)))
        worst = max(max(values) for values in off.values())
        if worst > LIMIT_V and self.rests() and self.is_root(volts):
            tally.other_root += 1
            tally.other_root_said += bool(self.solved.unstable[self.state] or self.solved.several[self.state])
            return
        tally.left[UNDEFINED] += undefined
        tally.states += 1
        tally.open_states += self.place != NONE and self.joint_ohm is None
        tally.beyond_band += self.beyond
        tally.leak_held += self.place != NONE and self.joint_ohm is None and not self.drawing.held(self.place)
        tally.volts += sum(len(values) - 1 for values in off.values())
        tally.worst_v = {what: max(value, *off[what]) for what, value in tally.worst_v.items()}
        if worst > LIMIT_V:
            tally.apart.append(f"{where}: {worst:.3g} V")

    def rests(self) -> bool:
        """Whether the package's answer is a root of the dense equations, and a stable one unless it says otherwise.

        Where nothing ties the site to earth the package reports too little to start from: there it has to agree with
        the root that the dense solve itself comes to.
        """
        dense, emf, states, state = self._dense, self.drawing.emf, self.states, self.state
        if np.isnan(self.solved.n_earth[0, state]):
            own = dense.solve(emf, states, state)
            at_rest = np.abs(dense.mismatch(own, emf, states, state)).max() < RESIDUAL_A
            return bool(at_rest and difference(dense, self.network, self.solved, state, own) <= ROOT_LIMIT_V)
        ours = filled(dense, from_package(dense, self.network, self.solved, state), emf, states, state)
        way, place = way_to_rest(dense, ours, emf, states, state)
        says_so = self.place == NONE or self.solved.unstable[state]
        return way <= ROOT_LIMIT_V and bool(says_so or stability(dense, place, states, state) > 0)

    def is_root(self, volts: dict[str, complex]) -> bool:
        """Whether an engine's answer is a root of the dense equations within LIMIT_V."""
        theirs = from_engine(self._dense, volts)
        x = np.concatenate([theirs.real, theirs.imag])
        return way_to_rest(self._dense, x, self.drawing.emf, self.states, self.state)[0] <= LIMIT_V

    @property
    def _dense(self) -> Dense:
        return Dense(self.drawing.site, self.place, self.joint_ohm)
