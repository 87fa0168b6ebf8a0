"""Standing third harmonic of a sound neutral: what an RMS device reads as displacement although nothing is broken."""

from dataclasses import dataclass

import numpy as np

from relaycfg.model.geometry import ComplexArray
from relaycfg.model.site import Site


@dataclass(frozen=True)
class ThirdHarmonic:
    """RMS of the third harmonic [V] in V0 and in N against the local PE."""

    v0_v: float
    n_pe_v: float


def third_harmonic(site: Site, board: str) -> ThirdHarmonic:
    """Third harmonic at ``board`` with every load connected.

    Each load's third harmonic is taken in phase on all lines, so it returns through the neutral threefold:
    V0 = I3 (Z_L + 3 Z_N) along the path, N against PE 3 I3 Z_N from where they are last tied, reactances at three
    times the frequency. Source: own arithmetic.
    """
    lines = len(site.supply.geometry.names)
    everywhere = tuple(b.name for b in site.boards)
    source = site.source
    v0 = _per_line(site, everywhere) * (_at_third(source.line_ohm) + lines * _at_third(source.neutral_ohm))
    n_pe = 0j
    for name in site.path(board):
        here = site.board(name)
        if here.cable is not None:
            amperes, neutral = _per_line(site, site.behind(name)), lines * _at_third(here.cable.neutral_ohm)
            v0 += amperes * (_at_third(here.cable.line_ohm) + neutral)
            n_pe += amperes * neutral
        if here.neutral_earth_link:
            n_pe = 0j
    return ThirdHarmonic(float(abs(v0)), float(abs(n_pe)))


def with_harmonic(tap: ComplexArray, harmonic: ThirdHarmonic) -> ComplexArray:
    """The tap whose |V0| and |N-PE| are root sums of squares with the harmonic (what an RMS device reads)."""
    v0, n_pe = tap[:-1].mean(), tap[-1]
    moved = tap.copy()
    moved[:-1] += _longer(v0, harmonic.v0_v) - v0
    moved[-1] = _longer(n_pe, harmonic.n_pe_v)
    return moved


def _longer(phasor: complex, added: float) -> complex:
    direction = phasor / abs(phasor) if abs(phasor) > 0 else 1.0
    return complex(direction * np.hypot(abs(phasor), added))


def _at_third(ohm: complex) -> complex:
    return complex(ohm.real, 3 * ohm.imag)


def _per_line(site: Site, boards: tuple[str, ...]) -> float:
    """Third-harmonic amperes a line of the loads to neutral at these boards, spread evenly."""
    amperes = sum(
        abs(complex(load.p_w, load.q_var)) / site.supply.nominal_v * load.third_harmonic_percent / 100
        for load in site.loads
        if load.board in boards and load.to_neutral
    )
    return amperes / len(site.supply.geometry.names)
