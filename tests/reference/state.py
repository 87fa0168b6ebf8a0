"""Figures of one solved state; the names of the properties are the keys that expected.toml may use."""

from functools import cached_property

import numpy as np

from relaycfg.model.break_results import BoardVolts, BreakRow
from relaycfg.model.geometry import ComplexArray
from relaycfg.network import Network, Solved
from relaycfg.relay.quantities import unbalance_percent
from relaycfg.study.break_rows import break_rows
from tests.reference.setting import Setting

MAIN = "Main"
"""Board on the source's own bar: where there is one, shifts count against its neutral."""


class State:
    """A solved setting. Magnitudes are what the break table shows, angles come from the solver's phasors.

    Volts and amperes r.m.s.; vn is the board's neutral against the source's star point. Raises ValueError where the
    solver does not come to rest.
    """

    def __init__(self, made: Setting) -> None:
        self._made = made
        self._network = Network(made.site)
        self._solved: Solved = self._network.solve(made.at, made.states, made.emf, made.joint_ohm)
        if not self._solved.converged.all():
            raise ValueError("the solver did not come to rest")
        self._index = self._network.boards.index(made.board)

    def __getitem__(self, key: str) -> object:
        """The figure of that key; KeyError where there is none."""
        if key.startswith("_") or not hasattr(type(self), key):
            raise KeyError(key)
        return getattr(self, key)

    def sought(self, key: str) -> float:
        """A figure that can be sought, straight from the phasors: solved many times over."""
        solved = self._solved
        return {
            "high_v": lambda: float(np.abs(self._l_n).max()),
            "touch_v": lambda: float(abs(solved.pe_earth[self._index, 0])),
            "joint_w": lambda: float((solved.joint_v[0] * solved.joint_a[0].conjugate()).real),
        }[key]()

    @cached_property
    def _row(self) -> BreakRow:
        made = self._made
        return break_rows(made.site, self._network, made.at, made.states, made.emf, made.joint_ohm)[0]

    @property
    def _board(self) -> BoardVolts:
        return self._row.boards[self._made.board]

    @property
    def _l_n(self) -> ComplexArray:
        return self._solved.l_n[self._index, :, 0]

    @property
    def _vn(self) -> complex:
        solved = self._solved
        if MAIN in self._network.boards:
            return complex(solved.n_earth[self._index, 0] - solved.n_earth[self._network.boards.index(MAIN), 0])
        return complex(solved.joint_v[0])

    @property
    def _admittance(self) -> ComplexArray:
        """Siemens of the loads from each line to N, by their ratings and factors."""
        site, total = self._made.site, np.zeros(len(self._l_n), complex)
        for load, factor in zip(site.loads, self._made.states.loads[:, 0], strict=True):
            if load.to_neutral and len(load.lines) == 1:
                total[load.lines[0]] += factor * complex(load.p_w, -load.q_var) / site.supply.nominal_v**2
        return total

    @property
    def _current(self) -> ComplexArray:
        """Line currents into line-to-neutral loads of constant impedance: Ohm's law on the solved volts."""
        return self._l_n * self._admittance

    l_n_v = property(lambda self: self._board.l_n_v)
    l1_v = property(lambda self: self._board.l_n_v[0])
    l2_v = property(lambda self: self._board.l_n_v[1])
    l3_v = property(lambda self: self._board.l_n_v[2])
    high_v = property(lambda self: max(self._board.l_n_v))
    low_v = property(lambda self: min(self._board.l_n_v))
    loaded_v = property(lambda self: self._board.l_n_v[:2], doc="Of two loaded lines beside an idle one.")
    sum_of_loaded_v = property(lambda self: sum(self.loaded_v))
    l_l_v = property(lambda self: self._board.l_l_v)
    v0_v = property(lambda self: self._board.v0_v)
    zero_sequence_v = property(lambda self: abs(self._made.site.supply.geometry.sequences(self._l_n)[0]))
    as_impedance_l_n_v = property(lambda self: self._row.all_impedance.boards[self._made.board].l_n_v)
    vn_v = property(lambda self: abs(self._vn))
    vn_deg = property(lambda self: np.angle(self._vn, deg=True))
    vn_real_v = property(lambda self: self._vn.real)
    vn_imag_v = property(lambda self: self._vn.imag)
    shift_pu = property(lambda self: abs(self._vn) / self._made.site.supply.nominal_v)
    touch_v = property(lambda self: self._board.pe_earth_v)
    neutral_a = property(lambda self: self._board.neutral_a)
    neutral_deg = property(lambda self: np.angle(self._solved.neutral_a[self._index, 0], deg=True))
    joint_a = property(lambda self: self._row.joint_a)
    joint_deg = property(lambda self: np.angle(self._solved.joint_a[0], deg=True))
    joint_w = property(lambda self: self._row.joint_w)
    current_a = property(lambda self: np.abs(self._current))
    current_deg = property(lambda self: np.angle(self._current, deg=True))
    i1_a = property(lambda self: abs(self._current[0]))
    i1_deg = property(lambda self: np.angle(self._current[0], deg=True))
    i2_a = property(lambda self: abs(self._current[1]))
    loop_a = i1_a
    load_w = property(lambda self: np.abs(self._l_n) ** 2 * self._admittance.real)
    leg_ohm = property(lambda self: self.l1_v / self.neutral_a, doc="Of the only load that is on, sound neutral.")
    series_ohm = property(lambda self: self.l_l_v[0] / self.i1_a, doc="Of two loads in series, open neutral.")
    below_band = property(lambda self: "below band" in self._row.flags)
    above_band = property(lambda self: "above band" in self._row.flags)

    @property
    def earth_a(self) -> float:
        """Through the electrode of the board."""
        electrode = self._made.site.board(self._made.board).electrode_ohm
        return float(self.touch_v / electrode)

    @property
    def earth_deg(self) -> float:
        """The angle of that current."""
        return float(np.angle(self._solved.pe_earth[self._index, 0], deg=True))

    v2_v1_percent = property(lambda self: self._unbalance("V2/V1"))
    pvur_percent = property(lambda self: self._unbalance("line-to-neutral deviation"))

    def _unbalance(self, definition: str) -> float:
        return float(unbalance_percent(definition, self._made.site.supply.geometry, self._l_n))

    @property
    def current_pu(self) -> float:
        """Neutral current over the rated current of the site's only load."""
        site = self._made.site
        return float(self.neutral_a / (abs(complex(site.loads[0].p_w, site.loads[0].q_var)) / site.supply.nominal_v))
