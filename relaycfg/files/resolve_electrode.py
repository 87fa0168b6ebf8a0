"""Earth electrodes in ohms: as given, or of rods and the soil they stand in."""

import math

from relaycfg.files.electrode_form import ElectrodeForm
from relaycfg.files.ledger import Ledger, figure


def rod_ohm(length_m: float, diameter_m: float, soil_ohm_m: float) -> float:
    """Resistance to remote earth [ohm] of one vertical rod, R = rho / (2 pi L) (ln(8 L / d) - 1).

    Source: BS 7430 (two texts agree). Valid for a rod much longer than thick, in soil of one resistivity.
    """
    return soil_ohm_m / (2 * math.pi * length_m) * (math.log(8 * length_m / diameter_m) - 1)


def group_ohm(one_ohm: float, rods: int, spacing_m: float, soil_ohm_m: float, factor: float) -> float:
    """Resistance [ohm] of equal rods in parallel, R (1 + lambda a) / n with a = rho / (2 pi R s).

    Source: BS 7430 (two texts agree). ``factor`` is the lambda of their arrangement; each rod lies in the field of
    the others, so n rods are worth less than n times one.
    """
    alpha = soil_ohm_m / (2 * math.pi * one_ohm * spacing_m)
    return one_ohm * (1 + factor * alpha) / rods


def electrode(ohm: float | None, form: ElectrodeForm | None, at: str, ledger: Ledger) -> float | None:
    """Ohms of an electrode as given, or of its rods; None where there is neither. ``at`` is its owner's field."""
    if form is None:
        if ohm is not None:
            ledger.given(at + "electrode_ohm", ohm, "ohm")
        return ohm
    at += "electrode."
    ledger.given(at + "rod_length_m", form.rod_length_m, "m")
    ledger.given(at + "rod_diameter_mm", form.rod_diameter_mm, "mm")
    row = ledger.tables.row("rod")
    one = rod_ohm(form.rod_length_m, form.rod_diameter_mm / 1000, form.soil_ohm_m)
    ledger.given(at + "soil_ohm_m", form.soil_ohm_m, "ohm*m", note=f"{figure(one)} ohm a rod, {row.cited}")
    if form.rods == 1:
        return one
    assert form.spacing_m is not None
    row = ledger.tables.row("rods-parallel")
    factor = form.group_factor
    if factor is None:
        factor = row.content["two_in_line_ratio"]
        ledger.default(at + "group_factor", factor, "", f"two rods are in line, {row.source}", row.status)
    else:
        ledger.given(at + "group_factor", factor)
    together = group_ohm(one, form.rods, form.spacing_m, form.soil_ohm_m, factor)
    ledger.given(at + "rods", form.rods)
    ledger.given(at + "spacing_m", form.spacing_m, "m", note=f"{figure(together)} ohm together, {row.cited}")
    return together
