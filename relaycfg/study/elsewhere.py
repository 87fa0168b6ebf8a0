"""Where another relay would have to sit to see the breaks that this one does not see, or clears only in part.

Every board behind the break is tried as the seat of a relay with the same device and settings that opens that board. A
seat is worth naming where this relay does not see the break, or where it would clear so many more of the harmful states
that the 95 % intervals of the two shares lie apart.
"""

from dataclasses import replace

import numpy as np

from relaycfg.model.place_results import Elsewhere, Seat
from relaycfg.study.evidence import Evidence
from relaycfg.study.scenarios import seen_places
from relaycfg.study.shares import share
from relaycfg.study.stages import ActiveStage
from relaycfg.study.together import (
    Acting,
    Models,
    board_deadlines_s,
    cleared_share,
    cleared_states,
    opens_s,
    solved_models,
)


def elsewhere(evidence: Evidence, stages: tuple[ActiveStage, ...]) -> tuple[Elsewhere, ...]:
    """One entry for every place that another seat would see better; none while nothing is set to trip."""
    if not stages:
        return ()
    site = evidence.site
    own = Acting(evidence.relay, stages, evidence)
    found = []
    for place in site.places:
        models = solved_models(evidence, place)
        seen = place in seen_places(site, evidence.relay)
        opened = ((evidence.relay, opens_s(own, place, models)),) if seen else ()
        cleared = cleared_share(*cleared_states(site, evidence.network, models, opened))
        best = best_seat(own, place, models)
        if not seen or best.cleared.low > cleared.high:
            relays = tuple(r.name for r in site.every_relay[1:] if place in seen_places(site, r))
            found.append(Elsewhere(place, seen, cleared, best, relays))
    return tuple(found)


def best_seat(own: Acting, place: str, models: Models) -> Seat:
    """The seat that clears most; the nearest to the break of equal ones.

    A seat clears at most the states in which all that is harmed lies behind its own switch, so those with the most of
    them are tried first, and the others only while they could clear more than the best one.
    """
    site, network = own.evidence.site, own.evidence.network
    harmed = [np.isfinite(board_deadlines_s(site, network, solved)) for _, solved in models]
    harmful = np.logical_or.reduce([h.any(axis=0) for h in harmed])
    most = {}
    for board in site.behind(place):
        outside = [k for k, name in enumerate(network.boards) if name not in site.behind(board)]
        most[board] = int((harmful & ~np.logical_or.reduce([h[outside].any(axis=0) for h in harmed])).sum())
    best: Seat | None = None
    for board in sorted(most, key=lambda b: -most[b]):
        if best is None or most[board] > best.cleared.count:
            seat = _seat(own, board, place, models)
            best = seat if best is None or seat.cleared.count > best.cleared.count else best
    assert best is not None
    return best


def _seat(own: Acting, board: str, place: str, models: Models) -> Seat:
    relay = replace(own.relay, measures_at=board, trips=board)
    seconds = opens_s(replace(own, relay=relay), place, models)
    site, network = own.evidence.site, own.evidence.network
    operates = np.all(
        [np.isfinite(s) & solved.converged for s, (_, solved) in zip(seconds, models, strict=True)], axis=0
    )
    cleared = cleared_share(*cleared_states(site, network, models, ((relay, seconds),)))
    return Seat(board, cleared, share(int(operates.sum()), len(operates)))
