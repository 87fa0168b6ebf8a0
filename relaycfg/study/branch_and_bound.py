"""The largest ratio |A| / |B| of two sums over switches that are on or off, with a proved upper bound.

A = a0 + sum a_i x_i and B = b0 + sum b_i x_i are complex, each x_i is 0 or 1. A node of the search has some switches
fixed; the others may take any value from 0 to 1 (a box), which can only raise the ratio. Its bound, for every x of the
box: |B| >= Re(B e^-j psi) for any angle psi, here the angle of B in the middle of the box; and where A points within
h of an angle phi, |A| <= Re(A e^-j phi) / cos h. The angles that A can take in the box are cut into SECTORS of half
width h. So the ratio is at most the largest over phi of the maximum over the box of Re(A e^-j phi) / Re(B e^-j psi),
divided by cos h: ratios of real linear sums with a positive denominator. Newton's method on the convex, falling
F(r) = max over the box (Re(A e^-j phi) - r Re(B e^-j psi)) finds that maximum; what is left of F over the least
denominator is added, so that the bound holds before the last step too. Fixing switches narrows both angles, and the
bound closes. A combination whose denominator vanishes is left out.
Source: own algebra; Newton on ratios: W. Dinkelbach, On nonlinear fractional programming, 1967 (from memory).
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from relaycfg.model.geometry import BoolArray, ComplexArray, FloatArray

SECTORS = 8
NEWTON_STEPS = 12
AT_ONCE = 256
"""Open nodes divided in one pass."""
CLOSE = 2.5e-4
"""Part of the best ratio found by which a bound may stand above it and still be taken as reached: 0.1 V at 400 V."""
ROUNDING = 1e-12
LEAST_PART = 1e-9
"""Part of the sum of all |b| that a denominator needs to count as other than rounding."""


@dataclass(frozen=True)
class Largest:
    """The largest ratio found, where, and what no combination can exceed (inf: nothing is proved)."""

    ratio: float
    row: int
    on: BoolArray
    bound: float
    nodes: int


@dataclass
class _Nodes:
    """Boxes: row of A, switches fixed on, switches free, bound."""

    row: NDArray[np.intp]
    on: BoolArray
    free: BoolArray
    bound: FloatArray

    def take(self, which: NDArray[np.intp] | BoolArray) -> "_Nodes":
        return _Nodes(self.row[which], self.on[which], self.free[which], self.bound[which])


def largest_ratio(a0: ComplexArray, a: ComplexArray, b0: complex, b: ComplexArray, most_nodes: int) -> Largest:
    """The largest |a0[k] + a[k] x| / |b0 + b x| over rows k and x of zeros and ones, after ``most_nodes`` boxes.

    ``a0`` [rows], ``a`` [rows, switches], ``b`` [switches]. A combination whose denominator vanishes is left out.
    """
    search = _Search(a0, a, b0, b)
    rows, switches = a.shape
    search.climb(_starts(a))
    nodes = _Nodes(np.arange(rows), np.zeros((rows, switches), bool), np.ones((rows, switches), bool), np.zeros(rows))
    nodes.bound = search.bounds(nodes)
    counted = rows
    settled = 0.0
    while len(nodes.row):
        open_ = nodes.bound > search.best * (1 + CLOSE)
        settled = max(settled, float(nodes.bound[~open_].max(initial=0.0)))
        nodes = nodes.take(open_)
        if counted >= most_nodes or not len(nodes.row):
            break
        order = np.argsort(-nodes.bound, kind="stable")
        children = search.divide(nodes.take(order[:AT_ONCE]))
        children.bound = search.bounds(children)
        counted += len(children.row)
        rest = nodes.take(order[AT_ONCE:])
        nodes = _Nodes(*(np.concatenate([getattr(n, f) for n in (rest, children)]) for f in vars(rest)))
    bound = max(search.best, settled, float(nodes.bound.max(initial=0.0)))
    return Largest(search.best, search.best_row, search.best_on, bound, counted)


def _starts(a: ComplexArray) -> BoolArray:
    """Combinations to climb from: for each row, the switches that pull A one way, in sixteen directions."""
    angles = np.exp(-2j * np.pi * np.arange(16) / 16)
    starts: BoolArray = (angles[:, None, None] * a).real.reshape(-1, a.shape[1]) > 0
    return starts


class _Search:
    """The coefficients, and the best combination met so far."""

    def __init__(self, a0: ComplexArray, a: ComplexArray, b0: complex, b: ComplexArray) -> None:
        self.a0, self.a, self.b0, self.b = a0, a, b0, b
        self.least = LEAST_PART * (abs(b0) + float(np.abs(b).sum()))
        self.best, self.best_row, self.best_on = 0.0, 0, np.zeros(len(b), bool)

    def climb(self, on: BoolArray) -> None:
        """Offer combinations [many, switches], and from each the best neighbour with one switch turned, to the top."""
        while len(on):
            ratios = self.offer(on)
            turned = on[:, None, :] ^ np.eye(on.shape[1], dtype=bool)
            around = self.offer(turned.reshape(-1, on.shape[1])).reshape(len(on), -1)
            better = around.max(axis=1, initial=0.0) > ratios * (1 + ROUNDING)
            on = turned[better, around[better].argmax(axis=1)] if better.any() else on[:0]

    def offer(self, on: BoolArray) -> FloatArray:
        """Largest ratio over the rows of each combination; the best of all is kept."""
        over = np.abs(self.b0 + on @ self.b)
        ratios = np.abs(self.a0[:, None] + self.a @ on.T) / np.maximum(over, self.least)
        ratios = np.where(over > self.least, ratios, 0.0)
        if ratios.size and ratios.max() > self.best:
            row, k = np.unravel_index(int(ratios.argmax()), ratios.shape)
            self.best, self.best_row, self.best_on = float(ratios[row, k]), int(row), on[k].copy()
        largest: FloatArray = ratios.max(axis=0)
        return largest

    def divide(self, nodes: _Nodes) -> _Nodes:
        """Each box in two, on and off, at the free switch that spreads the angles of A and B most."""
        a, b, mid_a, mid_b = self._middles(nodes)
        spread = np.abs((b * mid_b.conj()[:, None]).imag) / np.maximum(np.abs(mid_b) ** 2, self.least**2)[:, None]
        size = np.maximum(np.abs(mid_a) ** 2, (self.best * self.least) ** 2)[:, None]
        spread += np.abs((a * mid_a.conj()[:, None]).imag) / size
        spread += 1e-3 * np.abs(b) / np.maximum(np.abs(b).max(axis=1, keepdims=True), self.least)
        at = np.where(nodes.free, spread, -1.0).argmax(axis=1)
        each = np.arange(len(at))
        free, on = nodes.free.copy(), nodes.on.copy()
        free[each, at] = False
        on[each, at] = True
        kept = nodes.free[each, at]
        off = _Nodes(nodes.row, nodes.on, free, nodes.bound)
        both = (off.take(kept), _Nodes(nodes.row, on, free, nodes.bound).take(kept))
        return _Nodes(*(np.concatenate([getattr(n, f) for n in both]) for f in vars(off)))

    def _middles(self, nodes: _Nodes) -> tuple[ComplexArray, ComplexArray, ComplexArray, ComplexArray]:
        """Free coefficients [nodes, switches] of A and B, and both sums in the middle of the box."""
        rows = self.a[nodes.row]
        a, b = np.where(nodes.free, rows, 0), np.where(nodes.free, self.b, 0)
        fixed_a = self.a0[nodes.row] + np.where(nodes.on, rows, 0).sum(axis=1)
        fixed_b = self.b0 + nodes.on @ self.b
        return a, b, fixed_a + a.sum(axis=1) / 2, fixed_b + b.sum(axis=1) / 2

    def bounds(self, nodes: _Nodes) -> FloatArray:
        """Upper bound [nodes] of the ratio in each box; the corners met on the way are offered."""
        a, b, mid_a, mid_b = self._middles(nodes)
        turn_b = np.exp(-1j * np.angle(mid_b))
        q = (b * turn_b[:, None]).real
        q0 = (mid_b * turn_b).real - q.sum(axis=1) / 2
        least_q = q0 + np.minimum(q, 0).sum(axis=1)
        # All off with nothing fixed is 0/0 and left out: what is on then brings at least the smallest part.
        nothing = (np.abs(least_q) <= self.least) & nodes.free.any(axis=1)
        least_q = np.where(nothing, np.where(nodes.free, q, np.inf).min(axis=1, initial=np.inf), least_q)
        sound = least_q > self.least
        phi, half = self._sectors(a, mid_a)
        turn_a = np.exp(-1j * phi)
        p = (a[:, None, :] * turn_a[:, :, None]).real
        p0 = (mid_a[:, None] * turn_a).real - p.sum(axis=2) / 2
        q, q0 = q[:, None, :], np.where(sound, q0, 1.0)[:, None]
        ratio = np.full(p0.shape, self.best * 0.5)
        for _ in range(NEWTON_STEPS):
            on = p > ratio[:, :, None] * q
            over = q0 + np.where(on, q, 0).sum(axis=2)
            new = (p0 + np.where(on, p, 0).sum(axis=2)) / np.where(over > self.least, over, np.inf)
            if not (new[sound] > ratio[sound] * (1 + ROUNDING)).any():
                break
            ratio = np.maximum(ratio, new)
        left = p0 - ratio * q0 + np.maximum(p - ratio[:, :, None] * q, 0).sum(axis=2)
        highest = ratio + np.maximum(left, 0) / np.where(sound, least_q, 1.0)[:, None]
        best = highest.argmax(axis=1)
        each = np.arange(len(best))
        self.offer(nodes.on | (on[each, best] & nodes.free))
        bound: FloatArray = np.where(sound, highest[each, best] / np.cos(half), np.inf)
        whole: BoolArray = np.logical_not(nodes.free.any(axis=1))
        if whole.any():
            bound[whole] = self._exact(nodes.take(whole))
        return bound

    def _exact(self, nodes: _Nodes) -> FloatArray:
        """The ratio of boxes without a free switch; 0 where the denominator vanishes."""
        self.offer(nodes.on)
        over = np.abs(self.b0 + nodes.on @ self.b)
        above = np.abs(self.a0[nodes.row] + (self.a[nodes.row] * nodes.on).sum(axis=1))
        exact: FloatArray = np.where(over > self.least, above / np.maximum(over, self.least), 0.0)
        return exact

    def _sectors(self, a: ComplexArray, mid_a: ComplexArray) -> tuple[FloatArray, FloatArray]:
        """Middle angles [nodes, SECTORS] of the sectors that hold every A of a box, and their half widths [nodes]."""
        along = a * np.exp(-1j * np.angle(mid_a))[:, None]
        reach_re, reach_im = np.abs(along.real).sum(axis=1) / 2, np.abs(along.imag).sum(axis=1) / 2
        nearest = np.abs(mid_a) - reach_re
        wide = np.where(nearest > 0, np.arctan2(reach_im, np.maximum(nearest, 1e-300)), np.pi)
        half = wide / SECTORS
        phi = np.angle(mid_a)[:, None] + half[:, None] * (2 * np.arange(SECTORS) + 1 - SECTORS)
        return phi, half
