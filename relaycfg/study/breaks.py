"""What a lost neutral does on a site: every place it can break, every board, what the relay's terminals carry."""

import numpy as np

from relaycfg.model.break_results import BreakRow, BreakStudy, PlaceSummary
from relaycfg.model.site import NONE, Site
from relaycfg.network import LoadStates, Network, connected, corners, join, least, sampled
from relaycfg.study.break_rows import break_rows
from relaycfg.study.evidence import Evidence
from relaycfg.study.levels import NOMINAL, supply_levels
from relaycfg.study.place_summary import summarise, why_not_seen
from relaycfg.study.scenarios import Scenarios
from relaycfg.study.stages import ActiveStage

SAMPLE = "sample"
SINGLE_STATES = {"connected": connected, "least": least, "corners": corners}


def breaks(
    site: Site,
    *,
    samples: int,
    seed: int,
    at: str | None = None,
    joint_ohm: float | None = None,
    state: str | None = None,
) -> BreakStudy:
    """Break rows and place summaries without settings.

    ``at`` keeps one place (``none``: the sound network), ``joint_ohm`` puts a joint instead of an open break,
    ``state`` keeps one kind of load states (``sample``: no rows, only the summaries), or shows one sampled state
    again by its name, such as ``sample 17``. Raises ValueError for another name.
    """
    network = Network(site)
    emf = supply_levels(site, network).nominal
    places = (NONE, *site.places) if at is None else (at,)
    states = _rows_of(site, seed, state)
    rows: tuple[BreakRow, ...] = ()
    if states is not None:
        rows = tuple(row for place in places for row in break_rows(site, network, place, states, emf, joint_ohm))
    summaries: tuple[PlaceSummary, ...] = ()
    if state in (None, SAMPLE):
        drawn = sampled(site, samples, seed)
        summaries = tuple(
            summarise(site, network, place, network.solve(place, drawn, emf, joint_ohm), drawn, None, None, ())
            for place in places
            if place != NONE
        )
    seen = sum(not why_not_seen(site, network, place) for place in site.places)
    return BreakStudy(rows, summaries, seen, len(site.places), _notes(site, rows))


def _rows_of(site: Site, seed: int, state: str | None) -> LoadStates | None:
    """The load states to show one by one."""
    if state == SAMPLE:
        return None
    if state is not None and state.startswith(f"{SAMPLE} "):
        return sampled(site, 1, seed, start=int(state.removeprefix(f"{SAMPLE} ")))
    return join(*(SINGLE_STATES[k](site) for k in SINGLE_STATES if state in (None, k)))


def break_study(evidence: Evidence, stages: tuple[ActiveStage, ...]) -> BreakStudy:
    """Place summaries under settings, with the connected state of every place as rows."""
    site, network = evidence.site, evidence.network
    by_place = _nominal_pairs(evidence)
    state = connected(site)
    rows = tuple(
        row
        for place in (NONE, *site.places)
        for row in break_rows(site, network, place, state, evidence.levels.nominal, None)
    )
    summaries = tuple(
        summarise(site, network, place, evidence.solved[place], evidence.states, by_place.get(place), evidence, stages)
        for place in site.places
    )
    seen = sum(s.seen for s in summaries)
    return BreakStudy(rows, summaries, seen, len(site.places), _notes(site, rows))


def _nominal_pairs(evidence: Evidence) -> dict[str, tuple[Scenarios, Scenarios]]:
    pairs: dict[str, list[Scenarios]] = {}
    for scenario in evidence.scenarios:
        if scenario.level == NOMINAL:
            pairs.setdefault(scenario.place, []).append(scenario)
    return {place: (both[0], both[1]) for place, both in pairs.items()}


def _notes(site: Site, rows: tuple[BreakRow, ...]) -> tuple[str, ...]:
    """Breaks that move nothing: balanced load is invisible to every voltage element."""
    limit = site.judgement.balanced_pu * site.supply.nominal_v
    notes = []
    for row in rows:
        board = row.boards.get(row.at)
        still = board is not None and board.v0_v < limit
        if row.joint_ohm is None and still and row.boards and not _dead(row):
            notes.append(
                f"break at {row.at}, state {row.state}: V0 {board.v0_v if board else 0:.1f} V, the load behind it is "
                "balanced or off; not detectable by any voltage element"
            )
    return tuple(notes)


def _dead(row: BreakRow) -> bool:
    return bool(np.max(list(row.boards[row.at].l_n_v)) == 0.0)
