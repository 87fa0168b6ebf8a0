"""The earth a relay measures N against: its own board's PE, which a broken PEN lifts with N, or an electrode apart."""

import numpy as np

from relaycfg.model.device import Function
from relaycfg.model.geometry import FloatArray
from relaycfg.model.results import Finding
from relaycfg.model.site import NONE
from relaycfg.model.touch_results import EarthChoice, EarthSight
from relaycfg.network import Solved
from relaycfg.study.evidence import Evidence
from relaycfg.study.place_summary import only_n_to_earth
from relaycfg.study.scenarios import seen_places
from relaycfg.study.shares import share
from relaycfg.study.stages import ActiveStage


def earth_choice(evidence: Evidence, stages: tuple[ActiveStage, ...]) -> EarthChoice | None:
    """Both choices at the lowest pickup of the tripping 59N stages, each place upstream of the relay's tap.

    None for a device that takes displacement from its lines, and without such a stage.
    """
    relay, site, network = evidence.relay, evidence.site, evidence.network
    mine = [s for s in stages if s.function is Function.DISPLACEMENT]
    if relay.device.displacement_from != "n-to-earth" or not mine:
        return None
    stage = min(mine, key=lambda s: s.insensitive.pickup)
    board = network.boards.index(relay.measures_at)

    def both(solved: Solved) -> tuple[FloatArray, FloatArray]:
        local, own = (np.nan_to_num(np.abs(x[board])) for x in (solved.n_pe, solved.n_earth))
        return np.where(solved.converged, local, 0.0), np.where(solved.converged, own, 0.0)

    rows = []
    for place in seen_places(site, relay):
        local, own = both(evidence.solved[place])
        seen = [share(int((v >= stage.insensitive.pickup).sum()), len(v)) for v in (local, own)]
        rows.append(EarthSight(place, site.conductor(place), float(local.max()), float(own.max()), *seen))
    standing = both(network.solve(NONE, evidence.states, evidence.levels.nominal))
    return EarthChoice(
        relay.earth_reference,
        stage.stage.label,
        stage.stage.pickup,
        float(standing[0].max(initial=0.0)),
        float(standing[1].max(initial=0.0)),
        tuple(rows),
    )


def earth_findings(evidence: Evidence, stages: tuple[ActiveStage, ...]) -> list[Finding]:
    """Places that count as seen by other elements, where the local PE hides what an electrode apart would show."""
    choice = earth_choice(evidence, stages)
    if choice is None or choice.chosen == "own electrode" or only_n_to_earth(evidence.relay):
        return []
    hidden = [p for p in choice.places if p.local.count == 0 and p.own.count > 0]
    if not hidden:
        return []
    names = ", ".join(p.at for p in hidden)
    most = max(p.own.percent for p in hidden)
    return [
        Finding(
            "warning",
            choice.stage,
            f"{choice.stage} measures N against the PE of its own board, which a break at {names} lifts with N: it "
            f"sees none of the load states there, and up to {most:.1f} % at the same pickup against an electrode apart",
            'give the relay an electrode outside the influence of all others (earth_reference = "own electrode"), or '
            "take displacement from the lines",
            "a broken PEN is left to the other elements",
        )
    ]
