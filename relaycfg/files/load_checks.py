"""Loads held against the boards and against each other, and the law of each load against itself."""

from collections import Counter

from relaycfg.files.draft import Draft, PlacedLoad
from relaycfg.files.ledger import printed
from relaycfg.files.limits import BAND_HIGHEST_PU, ZIP_SUM_NEAR
from relaycfg.files.tables import Tables, names
from relaycfg.files.text import choose


def check_loads(draft: Draft, loads: list[PlacedLoad]) -> None:
    """There are loads, each with a name, a known board, one reading and a law that holds together."""
    if draft.lacks("load", "loads", "motor"):
        draft.add(("load",), "missing", "give at least one [[load]] or a [loads] file")
    for name, number in Counter(load.name for load in loads).items():
        if number > 1:
            again = [load for load in loads if load.name == name]
            again[1].add(draft, "name", f'"{name}", used before', "give every load a name of its own")
    usage: dict[str, float] = {}
    for load in loads:
        form = load.form
        if draft.boards_known and form.board not in draft.board_names:
            load.add(draft, "board", f'"{form.board}", an unknown board', choose(form.board, draft.board_names))
        readings = [n for n in ("kw", "current_a", "ohm") if getattr(form, n) is not None]
        if len(readings) != 1:
            given = "missing" if not readings else f"given beside {' and '.join(readings[1:])}"
            load.add(draft, readings[0] if readings else "kw", given, "give one of kw, current_a, ohm")
        if form.kw == 0:
            load.add(draft, "kw", "0", "give its rating, or remove the load")
        _load_law(draft, load)
        if form.group and form.usage is not None and usage.setdefault(form.group, form.usage) != form.usage:
            remedy = f"members of a group share one usage; write {usage[form.group]:g} or another group"
            load.add(draft, "usage", f'{form.usage:g} in group "{form.group}"', remedy)


def _load_law(draft: Draft, load: PlacedLoad) -> None:
    form = load.form
    if form.ohm is not None:
        if form.ohm[0] < 0 or form.ohm == [0, 0]:
            load.add(draft, "ohm", printed(form.ohm), "give a resistance of 0 or more and not both zero")
        for name in ("pf", "reactive", "kind", "zip_p", "zip_q", "band_pu"):
            if name in form.model_fields_set:
                load.add(draft, name, "given beside ohm", "remove it: ohm is a constant impedance")
    if form.kind is not None:
        if form.zip_p is not None:
            load.add(draft, "zip_p", "given beside kind", "keep one of them")
        if Tables().named("load-kinds", form.kind) is None:
            load.add(draft, "kind", f'"{form.kind}"', choose(form.kind, names("load-kinds")))
    elif form.zip_q is not None and form.zip_p is None:
        load.add(draft, "zip_q", "given without zip_p", "give zip_p too")
    for name in ("zip_p", "zip_q"):
        shares = getattr(form, name)
        if shares is not None and abs(sum(shares) - 1) > ZIP_SUM_NEAR:
            load.add(draft, name, f"of sum {sum(shares):g}", "give [z, i, p] of sum 1")
    if form.band_pu is not None and not 0 < form.band_pu[0] < 1 < form.band_pu[1] <= BAND_HIGHEST_PU:
        load.add(draft, "band_pu", printed(form.band_pu), "give [low, high]", "0 < low < 1 < high")
