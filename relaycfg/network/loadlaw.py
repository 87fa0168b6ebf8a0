"""Current of bounded ZIP branches and its slope, real and imaginary parts apart, states last."""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from relaycfg.model.geometry import BoolArray, FloatArray


@dataclass(frozen=True)
class Law:
    """Coefficients of I = U (cz + ci r + cp r^2), r = 1 / clip(|U|, low, high); [branches, states] each."""

    z_re: FloatArray
    z_im: FloatArray
    i_re: FloatArray
    i_im: FloatArray
    p_re: FloatArray
    p_im: FloatArray
    low_v: FloatArray
    high_v: FloatArray
    """[branches, 1] band edges [V]."""

    def rows(self, last: int) -> "Law":
        """The first ``last`` branches."""
        return Law(*(getattr(self, name)[:last] for name in self.__dataclass_fields__))

    def states(self, chosen: NDArray[np.intp]) -> "Law":
        """Some of the states."""
        names = [name for name in self.__dataclass_fields__ if name not in ("low_v", "high_v")]
        return replace(self, **{name: getattr(self, name)[:, chosen] for name in names})

    def cast(self, kind: type[np.floating]) -> "Law":
        """The same law in another precision."""
        return Law(*(getattr(self, name).astype(kind) for name in self.__dataclass_fields__))


@dataclass(frozen=True)
class Flow:
    """Branch admittances I / U at given voltages [branches, states], and what the slope needs."""

    g_re: FloatArray
    g_im: FloatArray
    magnitude: FloatArray
    inverse: FloatArray
    """1 / clip(|U|, low, high)."""


def flow(law: Law, u_re: FloatArray, u_im: FloatArray) -> Flow:
    """Admittance seen at voltages u [branches, states]; source: load law, definition."""
    magnitude = np.sqrt(u_re * u_re + u_im * u_im)
    inverse = 1 / np.clip(magnitude, law.low_v, law.high_v)
    return Flow(
        law.z_re + inverse * (law.i_re + inverse * law.p_re),
        law.z_im + inverse * (law.i_im + inverse * law.p_im),
        magnitude,
        inverse,
    )


def slope(law: Law, now: Flow, u_re: FloatArray, u_im: FloatArray) -> tuple[FloatArray, ...]:
    """a and b of dI = a dU + b conj(dU), as Re a, Im a, Re b, Im b; own differentiation of the load law.

    Inside the band a = g - s and b = -s (U / |U|)^2 with s = ci r / 2 + cp r^2; outside it a = g, b = 0.
    """
    r = now.inverse * ((now.magnitude > law.low_v) & (now.magnitude < law.high_v))
    s_re, s_im = r * law.p_re, r * law.p_im
    s_re += 0.5 * law.i_re
    s_im += 0.5 * law.i_im
    s_re *= r
    s_im *= r
    cos, sin = u_re * r, u_im * r  # of no account outside the band, where s is zero
    twice_re, twice_im = cos * cos, cos * sin
    twice_re -= sin * sin
    twice_im *= 2
    b_re = s_im * twice_im
    b_re -= s_re * twice_re
    b_im = s_re * twice_im
    b_im += s_im * twice_re
    return now.g_re - s_re, now.g_im - s_im, b_re, -b_im


def outside(law: Law, magnitude: FloatArray) -> tuple[BoolArray, BoolArray]:
    """States [states] with a branch below its band, and above it, where that changes the branch's law."""
    active = (law.i_re != 0) | (law.i_im != 0) | (law.p_re != 0) | (law.p_im != 0)
    below: BoolArray = np.any(active & (magnitude < law.low_v), axis=0)
    above: BoolArray = np.any(active & (magnitude > law.high_v), axis=0)
    return below, above
