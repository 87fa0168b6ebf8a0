"""Harm and deadlines: how long connected equipment stands the voltages of a break."""

import numpy as np

from relaycfg.model.geometry import BoolArray, FloatArray
from relaycfg.model.site import Equipment


def high_deadline_s(equipment: Equipment, highest_v: FloatArray) -> FloatArray:
    """Seconds within which a highest line-to-neutral RMS has to be cleared (inf: for ever).

    Reading "from v on at most s": none up to ``sustained_high_v``, ``sustained_high_s`` above it, then the last
    point at or below the voltage; beyond the last point its seconds are held.
    """
    deadline = np.where(highest_v > equipment.sustained_high_v, equipment.sustained_high_s, np.inf)
    for volts, seconds in equipment.high_points:
        deadline = np.where(highest_v >= volts, np.minimum(deadline, seconds), deadline)
    return deadline


def low_deadline_s(equipment: Equipment, lowest_v: FloatArray) -> FloatArray:
    """Seconds within which a lowest line-to-neutral RMS has to be cleared at boards that mind (inf: for ever)."""
    if equipment.sustained_low_v is None:
        return np.full_like(lowest_v, np.inf)
    deadline = np.where(lowest_v < equipment.sustained_low_v, equipment.sustained_low_s, np.inf)
    for volts, seconds in equipment.low_points:
        deadline = np.where(lowest_v <= volts, np.minimum(deadline, seconds), deadline)
    return deadline


def is_core(equipment: Equipment, highest_v: FloatArray, lowest_minding_v: FloatArray) -> BoolArray:
    """States that must all be cleared: at or above the first point, or at or below the worst low point."""
    core: BoolArray = np.zeros(highest_v.shape, bool)
    if equipment.high_points:
        core |= highest_v >= equipment.high_points[0][0]
    if equipment.sustained_low_v is not None and equipment.low_points:
        core |= lowest_minding_v <= equipment.low_points[-1][0]
    return core
