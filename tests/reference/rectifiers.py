"""Bridge rectifiers on a star by the package's simulation in time: volts, harmonics and currents."""

from pathlib import Path
from typing import Any

import numpy as np

from relaycfg.network.rectifier import Star, rectifier_waves


def rectifiers(_folder: Path, given: dict[str, Any]) -> dict[str, Any]:
    """Figures of one star; powers, capacitor, resistor and neutral as given, 50 Hz, line currents those of L1.

    Raises KeyError where a figure is missing, ValueError for one that nothing reads.
    """
    power = np.array([given.pop("load_w")], float)
    whole = np.ones_like(power)
    linear = given.pop("linear_ohm", None)
    star = Star(
        power,
        given.pop("capacitor_f") * whole,
        given.pop("series_ohm") * whole,
        given.pop("cutout_v", 0.0) * whole,
        whole * (0.0 if linear is None else 1 / linear),
        np.array([{"closed": True, "open": False}[given.pop("neutral")]]),
    )
    emf_v, steps, cycles = given.pop("source_l_n_v"), given.pop("steps_a_cycle_count"), given.pop("cycles_count")
    if given:
        raise ValueError(f"unknown key {', '.join(given)}")
    waves = rectifier_waves(star, emf_v, 50.0, steps, cycles)
    return {
        "phase_rms_v": waves.phase_v[0],
        "phase_peak_v": waves.phase_peak_v[0],
        "star_50_hz_v": waves.star_fundamental_v[0],
        "star_150_hz_v": waves.star_third_v[0],
        "neutral_rms_a": waves.neutral_a[0],
        "phase_current_rms_a": waves.line_a[0],
        "i1_a": waves.line_fundamental_a[0, 0],
        "i3_a": waves.line_third_a[0, 0],
    }
