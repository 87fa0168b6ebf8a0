"""One break place over all sampled load states: harm, operation, what is seen, what stays undetected."""

import numpy as np

from relaycfg.model.break_results import ElementSight, Harm, Operation, Percentiles, PlaceSummary, WorstState
from relaycfg.model.device import Function
from relaycfg.model.geometry import BoolArray, FloatArray
from relaycfg.model.site import Relay, Site
from relaycfg.network import LoadStates, Network, Solved, corners, healthy_emf, tap
from relaycfg.study.deadlines import high_deadline_s, low_deadline_s
from relaycfg.study.evidence import Evidence
from relaycfg.study.scenarios import Scenarios, seen_places
from relaycfg.study.shares import share
from relaycfg.study.stages import ActiveStage, operating_s

HARMS: tuple[Harm, ...] = ("none", "high volts", "low volts", "both")
OPERATIONS: tuple[Operation, ...] = ("in time", "late", "none")
WORST_SHOWN = 3
TOGETHER = "N and PE move together: the break is upstream of the split, N against PE stays near 0"
STILL_V = 0.001


def why_not_seen(site: Site, network: Network, place: str) -> str:
    """Why the relay cannot see a break at ``place``; empty where it can."""
    relay = site.relay
    if relay is None:
        return "no relay is described for this site"
    if place not in seen_places(site, relay):
        return f"the break is not upstream of the relay's tap at {relay.measures_at}"
    if not relay.device.elements:
        return "no element of the device has anything to measure in this system"
    if all(e.line_to_line_only for e in relay.device.elements):
        return "the device measures line to line only; a lost neutral does not move line-to-line volts"
    if only_n_to_earth(relay) and not _n_moves(site, network, place):
        if relay.earth_reference == "own electrode":
            return "the electrode stays on the loads' side of this break: the lines move against earth, N does not"
        return TOGETHER
    return ""


def only_n_to_earth(relay: Relay) -> bool:
    """Whether N against earth is the only quantity of the device that a lost neutral could move."""
    others = [e for e in relay.device.elements if not e.line_to_line_only and e.function is not Function.DISPLACEMENT]
    return relay.device.displacement_from == "n-to-earth" and not others


def _n_moves(site: Site, network: Network, place: str) -> bool:
    """Whether any corner of the load states moves N against the relay's earth at its board."""
    assert site.relay is not None
    solved = network.solve(place, corners(site), healthy_emf(site))
    taps = tap(solved, network.boards.index(site.relay.measures_at), site.relay.earth_reference)
    return bool(np.nan_to_num(np.abs(taps[:, -1])).max() > STILL_V)


def summarise(
    site: Site,
    network: Network,
    place: str,
    solved: Solved,
    states: LoadStates,
    pair: tuple[Scenarios, Scenarios] | None,
    evidence: Evidence | None,
    stages: tuple[ActiveStage, ...],
) -> PlaceSummary:
    """One place at nominal supply; ``pair`` holds its scenarios as modelled and all constant impedance.

    The class of a state is the worst over both load models: harmed if either is, and cleared only if each model
    that harms is; a state that neither harms has operated only if it has in both.
    """
    relay = site.relay
    # An unresolved state has no voltages to show; it is counted, and left out of every figure.
    magnitudes = np.where(solved.converged, np.abs(solved.l_n), 0.0)
    samples = magnitudes.shape[-1]
    highest = magnitudes.max(axis=(0, 1))
    why = why_not_seen(site, network, place)
    equipment = site.equipment
    harmed = np.isfinite(high_deadline_s(equipment, magnitudes.max(axis=1))) & solved.converged
    behind = set(site.behind(relay.trips)) if relay is not None else set()
    touched = tuple(b for k, b in enumerate(network.boards) if harmed[k].any())
    anywhere: BoolArray = np.stack([harmed.any(axis=0), _low_harm(site, network, magnitudes) & solved.converged])
    classes, harmful, undetected, unresolved = _classes(pair, evidence, stages, anywhere, solved, bool(why))
    return PlaceSummary(
        place,
        site.conductor(place),
        not why,
        why,
        samples,
        unresolved,
        {
            "below band": int(solved.below_band.sum()),
            "above band": int(solved.above_band.sum()),
            "unstable": int(solved.unstable.sum()),
        },
        {name: share(count, samples) for name, count in classes.items()},
        share(harmful, samples),
        share(undetected, samples),
        _percentiles(site, network, highest, solved),
        _worst(site, network, magnitudes, states),
        () if pair is None or evidence is None else _sights(pair, evidence, stages),
        touched,
        tuple(b for b in network.boards if b not in touched),
        tuple(b for b in touched if b not in behind),
        _largest(np.abs(solved.pe_earth[:, solved.converged])),
    )


def _low_harm(site: Site, network: Network, magnitudes: FloatArray) -> BoolArray:
    """States [states] in which a board that minds low volts has them."""
    minding = {load.board for load in site.loads if load.minds_low_v}
    boards = [k for k, name in enumerate(network.boards) if name in minding]
    if not boards:
        return np.zeros(magnitudes.shape[-1], bool)
    return np.isfinite(low_deadline_s(site.equipment, magnitudes[boards].min(axis=(0, 1))))


def _classes(
    pair: tuple[Scenarios, Scenarios] | None,
    evidence: Evidence | None,
    stages: tuple[ActiveStage, ...],
    harmed: BoolArray,
    solved: Solved,
    blind: bool,
) -> tuple[dict[str, int], int, int, int]:
    """Counts a class, then harmful, undetected and unresolved states.

    ``harmed`` [2, states]: high and low volts at any board. Without a relay, or for a break it cannot see, nothing
    operates. A state is undetected if under some load model it does no harm and nothing operates.
    """
    if pair is None or evidence is None:
        lost = int((~solved.converged).sum())
        kinds = harmed[0] + 2 * harmed[1]
        counts = {f"{HARMS[h]} / none": int((solved.converged & (kinds == h)).sum()) for h in range(len(HARMS))}
        count, none = sum(counts.values()) - counts["none / none"], counts["none / none"]
        return ({k: v for k, v in counts.items() if v} if blind else {}), count, none if blind else 0, lost
    resolved = pair[0].resolved & pair[1].resolved
    high, low = pair[0].high | pair[1].high, pair[0].low | pair[1].low
    harm = high + 2 * low
    operation = np.zeros(len(harm), int)
    hidden = np.zeros(len(harm), bool)
    for scenario in pair:
        operated = operating_s(stages, scenario, evidence)
        this = np.where(~np.isfinite(operated), 2, np.where(operated > scenario.deadline_s, 1, 0))
        # Where one model harms and the other does not, only the harmful one says whether the state is cleared.
        operation = np.maximum(operation, np.where(scenario.harmful | (harm == 0), this, 0))
        hidden |= ~scenario.harmful & ~np.isfinite(operated)
    counts = {
        f"{HARMS[h]} / {OPERATIONS[o]}": int((resolved & (harm == h) & (operation == o)).sum())
        for h in range(len(HARMS))
        for o in range(len(OPERATIONS))
    }
    harmful = int((resolved & (harm > 0)).sum())
    return {k: v for k, v in counts.items() if v}, harmful, int((resolved & hidden).sum()), int((~resolved).sum())


def _percentiles(site: Site, network: Network, highest: FloatArray, solved: Solved) -> tuple[Percentiles, ...]:
    rows = [("highest line-to-neutral, any board", highest)]
    if site.relay is not None:
        tap_l_n = solved.l_n[network.boards.index(site.relay.measures_at)]
        if site.supply.geometry.has_displacement:
            rows.append(("V0 at the relay", np.abs(site.supply.geometry.displacement(tap_l_n.T))))
        rows.append(("lowest line-to-neutral at the relay", np.abs(tap_l_n).min(axis=0)))
    there = solved.converged
    found = []
    for name, values in rows:
        if not there.any():
            continue
        p5, p50, p95, largest = (float(v) for v in np.percentile(values[there], [5, 50, 95, 100]))
        found.append(Percentiles(name, "V", p5, p50, p95, largest))
    return tuple(found)


def _worst(site: Site, network: Network, magnitudes: FloatArray, states: LoadStates) -> tuple[WorstState, ...]:
    flat = magnitudes.reshape(-1, magnitudes.shape[-1])
    order = np.argsort(flat.max(axis=0))[::-1][:WORST_SHOWN]
    lines = len(site.supply.geometry.names)
    found = []
    for k in order:
        where = int(np.argmax(flat[:, k]))
        found.append(
            WorstState(
                int(k),
                network.boards[where // lines],
                site.supply.geometry.names[where % lines],
                float(flat[where, k]),
                int((states.loads[:, k] != 0).sum()),
            )
        )
    return tuple(found)


def _sights(
    pair: tuple[Scenarios, Scenarios], evidence: Evidence, stages: tuple[ActiveStage, ...]
) -> tuple[ElementSight, ...]:
    """Share of states each element picks up in under both load models, and its fastest clearing time there."""
    found = []
    for function in dict.fromkeys(s.function for s in stages):
        mine = tuple(s for s in stages if s.function is function)
        seconds = np.maximum(*(operating_s(mine, scenario, evidence) for scenario in pair))
        seen = np.isfinite(seconds) & pair[0].resolved & pair[1].resolved
        fastest = float(seconds[seen].min()) if seen.any() else None
        found.append(ElementSight(function, share(int(seen.sum()), len(seen)), fastest))
    return tuple(found)


def _largest(values: FloatArray) -> float | None:
    return None if not values.size or np.isnan(values).all() else float(np.nanmax(values))
