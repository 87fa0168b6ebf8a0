"""Third harmonic: what an RMS device reads as V0 with a sound neutral, and with a lost one under rectifiers."""

from dataclasses import dataclass
from functools import cache
from typing import Literal

import numpy as np

from relaycfg.model.after_break_results import Balanced
from relaycfg.model.geometry import ComplexArray
from relaycfg.model.site import Site
from relaycfg.network.rectifier import Star, rectifier_waves
from relaycfg.study.levels import earth_reference
from relaycfg.study.load_volts import behind, mean_va

RECTIFIER_W = 300.0
"""Power of a rectifier that stands for all: its waveform is that of any power in per unit."""

UNDECIDED = 0.1
"""Share of the pickup within which an idealised rectifier decides nothing (own choice)."""


@dataclass(frozen=True)
class ThirdHarmonic:
    """RMS of the third harmonic [V] in V0 and in N against the earth of the tap."""

    v0_v: float
    n_pe_v: float


def third_harmonic(site: Site, board: str) -> ThirdHarmonic:
    """Third harmonic at ``board`` with every load connected.

    Each load's third harmonic is taken in phase on all lines of a star, so it returns through the neutral threefold:
    V0 = I3 (Z_L + 3 Z_N) along the path, N against PE 3 I3 Z_N from where they are last tied, reactances at three
    times the frequency. The legs of one winding cancel each other in the neutral; the greater one is taken, the
    other's loads being off. Without a V0 in the system there is none of it. Source: own arithmetic.
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
        if here.neutral_earth_link and earth_reference(site) == "local PE":
            n_pe = 0j
    return ThirdHarmonic(float(abs(v0)) if site.supply.geometry.has_displacement else 0.0, float(abs(n_pe)))


def with_harmonic(tap: ComplexArray, harmonic: ThirdHarmonic) -> ComplexArray:
    """The tap whose |V0| and |N-PE| are root sums of squares with the harmonic (what an RMS device reads)."""
    v0, n_pe = tap[:-1].mean(), tap[-1]
    moved = tap.copy()
    moved[:-1] += _longer(v0, harmonic.v0_v) - v0
    moved[-1] = _longer(n_pe, harmonic.n_pe_v)
    return moved


def balanced_rectifiers(
    site: Site, places: tuple[str, ...], pickup_v: float | None, detector: str
) -> dict[str, Balanced]:
    """V0 with the neutral lost at each place if its load were spread evenly; only where rectifiers are stated.

    The loads to neutral are split into peak rectifiers that draw the third harmonic they state, and linear load:
    rectifier share = third harmonic stated over that of a peak rectifier alone, both of the fundamental. A balanced
    load moves no fundamental, so a fundamental detector reads nothing. ``pickup_v``: of V0, least sensitive.
    Valid for idealised rectifiers on three stiff lines, without correction of the power factor, without cables.
    """
    stated = {}
    for place in places if len(site.supply.geometry.names) == 3 else ():
        loads = behind(site, place)
        third = sum(mean_va(load) * load.third_harmonic_percent / 100 for load in loads)
        if third > 0:
            stated[place] = third / sum(mean_va(load) for load in loads)
    if not stated:
        return {}
    emf_v, frequency_hz = site.source.emf_v, site.supply.frequency_hz
    share = np.minimum(np.array(list(stated.values())) / _third_of_rectifier(emf_v, frequency_hz), 1.0)
    power = np.full((len(share), 3), RECTIFIER_W)
    linear = RECTIFIER_W * ((1 - share) / share)[:, None] / emf_v**2 + 0 * power
    waves = rectifier_waves(Star.usual(power, linear, np.zeros(len(share), bool)), emf_v, frequency_hz)
    read = waves.star_v if detector == "rms" else waves.star_fundamental_v
    return {
        place: Balanced(
            float(100 * share[k]),
            float(waves.star_v[k]),
            float(waves.star_fundamental_v[k]),
            float(waves.star_third_v[k]),
            detector,
            pickup_v,
            _verdict(float(read[k]), pickup_v),
        )
        for k, place in enumerate(stated)
    }


def _verdict(read_v: float, pickup_v: float | None) -> Literal["sees", "borderline", "misses", "off"]:
    if pickup_v is None:
        return "off"
    if abs(read_v - pickup_v) <= UNDECIDED * pickup_v:
        return "borderline"
    return "sees" if read_v > pickup_v else "misses"


@cache
def _third_of_rectifier(emf_v: float, frequency_hz: float) -> float:
    """Third harmonic over fundamental current of peak rectifiers with a sound neutral."""
    power = np.full((1, 3), RECTIFIER_W)
    waves = rectifier_waves(Star.usual(power, 0 * power, np.ones(1, bool)), emf_v, frequency_hz)
    return float(waves.line_third_a[0, 0] / waves.line_fundamental_a[0, 0])


def _longer(phasor: complex, added: float) -> complex:
    direction = phasor / abs(phasor) if abs(phasor) > 0 else 1.0
    return complex(direction * np.hypot(abs(phasor), added))


def _at_third(ohm: complex) -> complex:
    return complex(ohm.real, 3 * ohm.imag)


def _per_line(site: Site, boards: tuple[str, ...]) -> float:
    """Third-harmonic amperes of the loads to neutral at these boards that add up in the neutral, spread evenly."""
    amperes = np.zeros(len(site.supply.geometry.names))
    for load in site.loads:
        if load.board in boards and load.to_neutral:
            volt_amperes = abs(complex(load.p_w, load.q_var)) * load.third_harmonic_percent / 100
            amperes[list(load.lines)] += volt_amperes / site.supply.nominal_v / len(load.lines)
    turned = site.supply.geometry.phasors**3
    together = (turned[:, None] * turned.conj()).real > 0
    return float((together @ amperes).max()) / len(amperes)
