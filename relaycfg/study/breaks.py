"""What a lost neutral does on a site: every place it can break, every board, what the relay's terminals carry."""

from relaycfg.model.break_results import BreakRow, BreakStudy, PlaceSummary
from relaycfg.model.joint_results import JointSweep
from relaycfg.model.place_results import HighestVoltage
from relaycfg.model.site import NONE, Site
from relaycfg.network import Network, connected, sampled
from relaycfg.study.break_rows import break_rows
from relaycfg.study.evidence import Evidence
from relaycfg.study.highest_voltage import highest_voltages
from relaycfg.study.joint_sweep import sweeps
from relaycfg.study.levels import NOMINAL, supply_levels
from relaycfg.study.named_states import SAMPLE, WORST, states_named
from relaycfg.study.place_summary import summarise, why_not_seen
from relaycfg.study.scenarios import Scenarios
from relaycfg.study.stages import ActiveStage


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
    ``state`` keeps one kind of load states (``sample``: no rows, only the summaries), or shows states again by their
    name, such as ``sample 17``, ``worst`` or ``on: A; B`` (see ``states_named``). Raises ValueError for another name.
    """
    network = Network(site)
    emf = supply_levels(site, network).nominal
    places = (NONE, *site.places) if at is None else (at,)
    highest: tuple[HighestVoltage, ...] = ()
    if state == WORST or (state in (None, SAMPLE) and joint_ohm is None):
        highest = highest_voltages(site, network, emf, tuple(p for p in places if p != NONE))
    rows: list[BreakRow] = []
    for place in places:
        states = states_named(site, place, seed, state, highest)
        rows += break_rows(site, network, place, states, emf, joint_ohm) if states is not None else ()
    summaries: tuple[PlaceSummary, ...] = ()
    joints: tuple[JointSweep, ...] = ()
    if state in (None, SAMPLE):
        drawn = sampled(site, samples, seed)
        solved = {place: network.solve(place, drawn, emf, joint_ohm) for place in places if place != NONE}
        summaries = tuple(
            summarise(site, network, place, found, drawn, None, None, ()) for place, found in solved.items()
        )
        joints = sweeps(site, network, emf, drawn, solved, {}) if joint_ohm is None else ()
    seen = sum(not why_not_seen(site, network, place) for place in site.places)
    return BreakStudy(tuple(rows), summaries, seen, len(site.places), _notes(site, tuple(rows)), joints, highest)


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
    highest = highest_voltages(site, network, evidence.levels.nominal, site.places)
    return BreakStudy(rows, summaries, seen, len(site.places), _notes(site, rows), highest=highest)


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
        if row.at == NONE or row.joint_ohm is not None or not row.boards:
            continue
        behind = [row.boards[name] for name in site.behind(row.at)]
        v0_v = max(board.v0_v for board in behind)
        if v0_v < limit and any(max(board.l_n_v) > 0 for board in behind):
            notes.append(
                f"break at {row.at}, state {row.state}: V0 {v0_v:.1f} V, the load behind it is balanced or off; not "
                "detectable by any voltage element"
            )
    return tuple(notes)
