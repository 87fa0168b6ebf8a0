"""Electrodes held against themselves: ohms or rods, and what several rods need."""

from relaycfg.files.draft import Draft
from relaycfg.files.electrode_form import ElectrodeForm
from relaycfg.files.positions import Loc
from relaycfg.files.site_form import BoardForm, SourceForm

PAIR = 2
"""Rods whose arrangement is known: two are always in line."""


def check_electrodes(draft: Draft) -> None:
    """One way of telling an electrode, a rod longer than thick, and spacing and factor where rods stand together."""
    owners: list[tuple[Loc, SourceForm | BoardForm]] = [(e.loc, e.form) for e in draft.sources]
    owners += [(e.loc, e.form) for e in draft.boards]
    for loc, owner in owners:
        form = owner.electrode
        if form is None:
            continue
        if owner.electrode_ohm is not None:
            draft.add((*loc, "electrode"), "given beside electrode_ohm", "keep one of them")
        _check(draft, (*loc, "electrode"), form)


def _check(draft: Draft, loc: Loc, form: ElectrodeForm) -> None:
    if form.rod_diameter_mm / 1000 >= form.rod_length_m:
        draft.add((*loc, "rod_diameter_mm"), f"{form.rod_diameter_mm:g}, no less than its length", "give millimetres")
    needs = {"spacing_m": form.rods > 1, "group_factor": form.rods > PAIR}
    for name, needed in needs.items():
        given = getattr(form, name) is not None
        if needed and not given:
            draft.add((*loc, name), "missing", f"give it for {form.rods} rods")
        elif given and form.rods == 1:
            draft.add((*loc, name), "not used by one rod", "remove it, or give the number of rods")
    if form.spacing_m is not None and form.rods > 1 and form.spacing_m <= form.rod_diameter_mm / 1000:
        draft.add((*loc, "spacing_m"), f"{form.spacing_m:g}, no more than the diameter of a rod", "give metres")
