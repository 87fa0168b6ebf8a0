"""One sweep of all states: currents at the last voltages, the intact network, a guarded Newton step for the joint.

Own algebra: with every joint whole and an EMF w in series with the one that breaks, all the stiffness of a floating
neutral is in w, so U* = u_open - z i(U) + h w contracts with the network's relative voltage drop, and w follows from
one complex equation F(w) = 0 a state, solved by Newton's method on 2 x 2 reals. A middle admittance m of each branch
is moved into the network, U* = (1 + z m)^-1 (u_open - z (i - m U) + h w), so that sweeps contract with the spread of
the loads about it instead; F keeps the whole currents, since a middle far above a light state would swamp it there.
"""

from dataclasses import dataclass, replace

import numpy as np

from relaycfg.model.geometry import BoolArray, ComplexArray, FloatArray
from relaycfg.network.loadlaw import Flow, Law, flow, slope

LARGEST_CAP_V = 1e4
QUIET_V = 1e-3
"""Turns of smaller steps are rounding, not overshoot."""


@dataclass(frozen=True)
class Problem:
    """One break place at one EMF. Branches are in an order that puts those the joint acts on first.

    U = ``u_open`` [branches, 1] - ``z`` (i - ``middle`` U) + ``h`` w; joint current = ``c0`` - ``back`` i + ``y`` w, i
    being all current of the branches. Without a ``joint`` the EMF w stays zero.
    """

    u_open: ComplexArray
    z: ComplexArray
    h: ComplexArray
    back: ComplexArray
    c0: complex
    y: complex
    joint_s: float
    """Admittance of the joint, 0 when open."""
    joint: bool
    acted_on: int
    """Number of leading branches whose current the joint carries."""
    middle: ComplexArray
    """[branches] admittance [S] already inside the network."""

    def about(self, middle: ComplexArray) -> "Problem":
        """The same problem with ``middle`` moved into the network; valid for one without any inside."""
        inner = np.linalg.inv(np.eye(len(middle)) + self.z * middle)
        return replace(self, u_open=inner @ self.u_open, z=inner @ self.z, h=inner @ self.h, middle=middle)

    def real(self) -> tuple[FloatArray, FloatArray]:
        """The map from i - middle U and w to U and F, Re above Im in each, as a matrix and its loadless column."""
        z, h, back, y, c0 = self.z, self.h[:, None], self.back[None, :], np.array([[self.y]]), np.array([[self.c0]])
        matrix = np.vstack(
            [
                np.hstack([-z.real, z.imag, h.real, -h.imag]),
                np.hstack([-z.imag, -z.real, h.imag, h.real]),
                np.hstack([-back.real, back.imag, y.real, -y.imag]),
                np.hstack([-back.imag, -back.real, y.imag, y.real]),
            ]
        )
        return matrix, np.vstack([self.u_open.real, self.u_open.imag, c0.real, c0.imag])


@dataclass
class Iterate:
    """Voltages [branches, states] and joint EMF [2, states] on the way, with the step cap [V] and the last step."""

    u_re: FloatArray
    u_im: FloatArray
    w: FloatArray
    cap: FloatArray
    last: FloatArray


@dataclass(frozen=True)
class Jacobian:
    """Slopes of the branches the joint acts on, [2, states] alpha and beta of the joint equation, and its guard."""

    a_re: FloatArray
    a_im: FloatArray
    b_re: FloatArray
    b_im: FloatArray
    alpha: FloatArray
    beta: FloatArray
    shift: FloatArray


class Sweeper:
    """One sweep in one precision over one block of states."""

    def __init__(self, problem: Problem, law: Law, leak_s: FloatArray, kind: type[np.floating]) -> None:
        self.problem = problem
        self.law = law if law.z_re.dtype == kind else law.cast(kind)
        self.acted = self.law.rows(problem.acted_on)
        self.product, self.constant = (part.astype(kind) for part in problem.real())
        self.joint_s = (problem.joint_s + leak_s).astype(kind)
        h, back = problem.h[: problem.acted_on], problem.back[: problem.acted_on]

        def halves(x: ComplexArray) -> tuple[FloatArray, FloatArray]:
            return x.real.astype(kind), x.imag.astype(kind)

        self.h_re, self.h_im = halves(problem.h[:, None])
        self.back_re, self.back_im = halves(back)
        self.square_re, self.square_im = halves(back * h)
        self.weight_re, self.weight_im = halves(back * h.conj())
        self.middle_re, self.middle_im = halves(problem.middle[:, None])
        self.inside_re, self.inside_im = halves(back * problem.middle[: problem.acted_on])

    def target(self, at: Iterate) -> tuple[FloatArray, FloatArray, Flow]:
        """U* [2 branches, states] and F [2, states] at the iterate, with the admittances behind them."""
        count = len(at.u_re)
        now = flow(self.law, at.u_re, at.u_im)
        drive = np.empty((2 * count + 2, at.u_re.shape[1]), at.u_re.dtype)
        g_re, g_im = now.g_re - self.middle_re, now.g_im - self.middle_im
        drive[:count] = g_re * at.u_re - g_im * at.u_im
        drive[count : 2 * count] = g_re * at.u_im + g_im * at.u_re
        drive[2 * count :] = at.w
        result = self.product @ drive
        result += self.constant
        residual = result[2 * count :] - self.joint_s * at.w
        u_re, u_im = at.u_re[: self.problem.acted_on], at.u_im[: self.problem.acted_on]
        residual[0] -= self.inside_re @ u_re - self.inside_im @ u_im
        residual[1] -= self.inside_re @ u_im + self.inside_im @ u_re
        return result[: 2 * count], residual, now

    def jacobian(self, u_re: FloatArray, u_im: FloatArray, now: Flow) -> Jacobian:
        """Slopes at voltages u; the shift keeps the joint equation's 2 x 2 system positive definite."""
        k = self.problem.acted_on
        part = Flow(now.g_re[:k], now.g_im[:k], now.magnitude[:k], now.inverse[:k])
        a_re, a_im, b_re, b_im = slope(self.acted, part, u_re[:k], u_im[:k])
        y = self.problem.y
        alpha = np.stack(
            [
                self.square_re @ a_re - self.square_im @ a_im - y.real + self.joint_s[0],
                self.square_re @ a_im + self.square_im @ a_re - y.imag,
            ]
        )
        beta = np.stack(
            [
                self.weight_re @ b_re - self.weight_im @ b_im,
                self.weight_re @ b_im + self.weight_im @ b_re,
            ]
        )
        least = 1.05 * np.hypot(*beta)
        # More than just positive: generation alone would leave alpha at nothing, and a step of nothing looks like rest.
        shift = np.where(alpha[0] < least, least + 0.05 * np.hypot(*alpha) - alpha[0], 0)
        return Jacobian(a_re, a_im, b_re, b_im, alpha, beta, shift)

    def joint_step(self, residual: FloatArray, d_re: FloatArray, d_im: FloatArray, jac: Jacobian) -> FloatArray:
        """dw [2, states] from alpha dw + beta conj(dw) = F - back (a D + b conj D)."""
        t_re = (jac.a_re + jac.b_re) * d_re + (jac.b_im - jac.a_im) * d_im
        t_im = (jac.a_im + jac.b_im) * d_re + (jac.a_re - jac.b_re) * d_im
        r_re = residual[0] - (self.back_re @ t_re - self.back_im @ t_im)
        r_im = residual[1] - (self.back_re @ t_im + self.back_im @ t_re)
        alpha_re, alpha_im = jac.alpha[0] + jac.shift, jac.alpha[1]
        beta_re, beta_im = jac.beta
        scale = 1 / np.maximum(alpha_re**2 + alpha_im**2 - beta_re**2 - beta_im**2, 1e-30)  # singular: the cap rules
        step: FloatArray = np.stack(
            [
                ((alpha_re - beta_re) * r_re + (alpha_im - beta_im) * r_im) * scale,
                ((alpha_re + beta_re) * r_im - (alpha_im + beta_im) * r_re) * scale,
            ]
        )
        return step

    def sweep(self, at: Iterate, jac: Jacobian | None = None) -> tuple[FloatArray, Jacobian | None]:
        """Move the iterate one sweep on; the size of the move [V] [states], and the Jacobian (fresh unless given)."""
        count, k = len(at.u_re), self.problem.acted_on
        target, residual, now = self.target(at)
        u_re, u_im = target[:count], target[count:]
        d_re, d_im = u_re - at.u_re, u_im - at.u_im
        size: FloatArray = np.sqrt((d_re * d_re + d_im * d_im).max(axis=0, initial=0))
        if self.problem.joint:
            if jac is None:
                jac = self.jacobian(at.u_re, at.u_im, now)
            kind = jac.a_re.dtype
            step = self.joint_step(residual, d_re[:k].astype(kind, copy=False), d_im[:k].astype(kind, copy=False), jac)
            length = np.hypot(*step)
            halved = 0.5 * np.minimum(at.cap, np.hypot(*at.last))
            at.cap = np.where(_turned(at.last, step, length), halved, np.minimum(1.3 * at.cap, LARGEST_CAP_V))
            step *= np.minimum(1, at.cap / np.maximum(length, 1e-30))
            at.w, at.last = at.w + step, step
            u_re += self.h_re * step[0] - self.h_im * step[1]
            u_im += self.h_re * step[1] + self.h_im * step[0]
            size = np.maximum(size, length)
        at.u_re, at.u_im = u_re, u_im
        return size, jac


def _turned(last: FloatArray, step: FloatArray, length: FloatArray) -> BoolArray:
    """Where a step turns back on the last one by more than rounding."""
    before = np.hypot(*last)
    along = (step * last).sum(axis=0)
    turned: BoolArray = (along < -0.3 * length * before) & (length > 0.2 * before) & (length > QUIET_V)
    return turned
