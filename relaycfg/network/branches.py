"""Loads and motors merged into branches: all that hangs between the same two points with the same band."""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from relaycfg.model.geometry import ComplexArray, FloatArray
from relaycfg.model.site import Load, Motor, Site
from relaycfg.network.states import RUNNING, STARTING

CONSTANT_IMPEDANCE = (1.0, 0.0, 0.0)


@dataclass(frozen=True)
class Branches:
    """Branches of a site and what each load and motor contributes to them.

    A branch carries I = U (cz + ci r + cp r^2), r = 1 / clip(|U|, low_v, high_v): the ZIP polynomial of P and Q
    inside the band, the constant impedance of the edge outside it, current continuous. ``see`` [branches, ports]
    gives U from the line-to-neutral voltages of all boards (ports: boards times lines), ``feed`` [ports, branches]
    the port currents from I.
    """

    see: ComplexArray
    feed: ComplexArray
    board: tuple[int, ...]
    """Board index of each branch."""
    low_v: FloatArray
    high_v: FloatArray
    nominal_v: FloatArray
    of_load: ComplexArray
    """[3, branches, loads]: cz [S], ci [A], cp [VA] of each load at its rating."""
    as_impedance: ComplexArray
    """[branches, loads]: cz of each load taken as the constant impedance of its rating."""
    running: ComplexArray
    starting: ComplexArray
    """[branches, motors] [S]."""

    def coefficients(
        self, loads: FloatArray, motors: NDArray[np.int8], order: NDArray[np.intp], all_impedance: bool
    ) -> tuple[FloatArray, ...]:
        """Real and imaginary cz, ci, cp: six arrays [branches, states], branches in ``order``.

        ``loads`` and ``motors`` are the arrays of LoadStates; ``all_impedance`` takes loads as ``as_impedance``.
        """
        admittance = self.as_impedance if all_impedance else self.of_load[0]
        stack = [admittance, np.zeros_like(admittance), np.zeros_like(admittance)] if all_impedance else self.of_load
        parts = [part for c in stack for part in (c.real[order] @ loads, c.imag[order] @ loads)]
        for running, motor in ((RUNNING, self.running), (STARTING, self.starting)):
            on = (motors == running).astype(float)
            if on.any():
                parts[0] += motor.real[order] @ on
                parts[1] += motor.imag[order] @ on
        return tuple(parts)


class _Builder:
    """Collects branches by board, place and band."""

    def __init__(self, site: Site) -> None:
        self.geometry = site.supply.geometry
        self.nominal_v = site.supply.nominal_v
        self.boards = {b.name: k for k, b in enumerate(site.boards)}
        self.lines = len(self.geometry.names)
        self.rows: dict[tuple[int, str, int, float, float], int] = {}
        self.see: list[ComplexArray] = []
        self.feed: list[ComplexArray] = []
        self.nominal: list[float] = []

    def row(self, board: int, place: str, index: int, band: tuple[float, float] | None) -> int:
        """The branch at that place; one without a band joins any there is, its law being linear."""
        if band is None:
            for key, row in self.rows.items():
                if key[:3] == (board, place, index):
                    return row
        see, feed, nominal = self._incidence(place, index)
        low, high = band or (0.5, 2.0)
        key = (board, place, index, low * nominal, high * nominal)
        if key not in self.rows:
            self.rows[key] = len(self.rows)
            for vectors, local in ((self.see, see), (self.feed, feed)):
                vector = np.zeros(len(self.boards) * self.lines, complex)
                vector[board * self.lines : (board + 1) * self.lines] = local
                vectors.append(vector)
            self.nominal.append(nominal)
        return self.rows[key]

    def _incidence(self, place: str, index: int) -> tuple[ComplexArray, ComplexArray, float]:
        """What a branch sees of its board's line-to-neutral voltages, how it feeds back, and its nominal volts."""
        unit = np.eye(self.lines, dtype=complex)
        phasors = self.geometry.phasors
        if place == "line":
            return unit[index], unit[index], self.nominal_v
        if place == "pair":
            i, j = self.geometry.pairs[index]
            return unit[i] - unit[j], unit[i] - unit[j], self.nominal_v * float(abs(phasors[i] - phasors[j]))
        sequence = phasors if index == 1 else phasors.conj()
        return sequence.conj() / self.lines, sequence, self.nominal_v

    def shares(self, item: Load | Motor) -> Iterator[tuple[str, int, float]]:
        """Places of an item's single-phase parts and the share of its power in each."""
        if item.to_neutral:
            yield from (("line", line, 1 / len(item.lines)) for line in item.lines)
        else:
            pairs = [k for k, pair in enumerate(self.geometry.pairs) if set(pair) <= set(item.lines)]
            yield from (("pair", k, 1 / len(pairs)) for k in pairs)


def build_branches(site: Site) -> Branches:
    """Branches of all loads and motors of a site.

    A star tied to N is one line-to-neutral branch a line, a three-wire load one branch a line pair, an equal
    share in each. A three-wire motor is a positive and a negative sequence branch: running, the negative
    sequence meets the locked-rotor admittance (slip 2 - s is near standstill, usual approximation); it has no
    zero sequence. Other motors are constant admittances.
    """
    builder = _Builder(site)
    loads: list[tuple[int, int, ComplexArray]] = []
    ratings: list[tuple[int, int, complex]] = []
    linear = [_is_linear(load) for load in site.loads]
    for wanted in (False, True):  # banded loads first, so that linear ones find a branch to join
        for number, load in enumerate(site.loads):
            if linear[number] is not wanted:
                continue
            band = None if wanted else (load.band_low_pu, load.band_high_pu)
            for place, index, share in builder.shares(load):
                row = builder.row(builder.boards[load.board], place, index, band)
                nominal = builder.nominal[row]
                loads.append((row, number, share * _polynomial(load, nominal)))
                ratings.append((row, number, share * complex(load.p_w, -load.q_var) / nominal**2))
    machines: list[tuple[int, int, complex, complex]] = []
    for number, motor in enumerate(site.motors):
        board = builder.boards[motor.board]
        run, start = motor.running_va.conjugate(), motor.starting_va.conjugate()
        if not motor.to_neutral and len(motor.lines) == builder.lines > 2:
            square = builder.lines * builder.nominal_v**2
            machines.append((builder.row(board, "sequence", 1, None), number, run / square, start / square))
            machines.append((builder.row(board, "sequence", 2, None), number, start / square, start / square))
            continue
        for place, index, share in builder.shares(motor):
            row = builder.row(board, place, index, None)
            square = builder.nominal[row] ** 2
            machines.append((row, number, share * run / square, share * start / square))
    count = len(builder.rows)
    of_load = np.zeros((3, count, len(site.loads)), complex)
    as_impedance = np.zeros((count, len(site.loads)), complex)
    running, starting = np.zeros((2, count, len(site.motors)), complex)
    for row, number, polynomial in loads:
        of_load[:, row, number] += polynomial
    for row, number, admittance in ratings:
        as_impedance[row, number] += admittance
    for row, number, run, start in machines:
        running[row, number] += run
        starting[row, number] += start
    keys = list(builder.rows)
    ports = len(site.boards) * builder.lines
    return Branches(
        np.array(builder.see).reshape(count, ports),
        np.array(builder.feed).reshape(count, ports).T,
        tuple(key[0] for key in keys),
        np.array([key[3] for key in keys]),
        np.array([key[4] for key in keys]),
        np.array(builder.nominal),
        of_load,
        as_impedance,
        running,
        starting,
    )


def _is_linear(load: Load) -> bool:
    return load.zip_p == CONSTANT_IMPEDANCE and load.zip_q == CONSTANT_IMPEDANCE


def _polynomial(load: Load, nominal_v: float) -> ComplexArray:
    """cz, ci, cp [3] of a load at ``nominal_v``: I = conj(S / U), S = P zip_p(m) + j Q zip_q(m), m = |U| / nominal."""
    power = load.p_w * np.array(load.zip_p) - 1j * load.q_var * np.array(load.zip_q)
    coefficients: ComplexArray = power / np.array([nominal_v**2, nominal_v, 1.0])
    return coefficients
