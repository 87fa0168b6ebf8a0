"""The root that hangs together with the sound neutral: a joint's resistance raised in small steps, dense equations.

Where the path folds back, or its root turns into a saddle (the slope's determinant changes sign), nothing stable is
left near the last state: the neutral jumps, and no root is continuous with the sound network.
"""

import numpy as np

from relaycfg.model.site import Site
from relaycfg.network import LoadStates
from tests.network.dense import Dense
from tests.reference.roots_at_rest import slope_sign, way_to_rest

FIRST_OHM, LAST_OHM = 1e-2, 1e6
RATIO, LEAST_RATIO = 1.7, 1.001
LONGEST_MOVE_V = 5.0
"""A step that moves a node further, or to another sign, is taken again
with less resistance, so that it cannot jump to another root."""


def connected_root(
    made: Site, place: str, emf: np.ndarray, states: LoadStates, state: int, last_ohm: float | None = None
) -> np.ndarray | None:
    """Unknowns with ``place`` open (or at ``last_ohm``), reached without a jump; None where the path folds back."""
    x = Dense(made, place, FIRST_OHM).solve(emf, states, state)
    sign = slope_sign(Dense(made, place, FIRST_OHM), x, states, state)
    ohm, ratio, last = FIRST_OHM, RATIO, LAST_OHM if last_ohm is None else last_ohm
    while ohm < last:
        following = min(ohm * ratio, last)
        dense = Dense(made, place, following)
        way, found = way_to_rest(dense, x, emf, states, state)
        if way <= LONGEST_MOVE_V and slope_sign(dense, found, states, state) == sign:
            x, ohm, ratio = found, following, min(RATIO, ratio * 1.1)
        elif ratio < LEAST_RATIO:
            return None
        else:
            ratio = ratio**0.5
    if last_ohm is not None:
        return x
    dense = Dense(made, place)
    way, found = way_to_rest(dense, x, emf, states, state)
    return found if way <= LONGEST_MOVE_V and slope_sign(dense, found, states, state) == sign else None
