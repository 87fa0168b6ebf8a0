"""The largest shift that a voltage window leaves unseen, over all resistive loads of a floating star."""

from pathlib import Path
from typing import Any

import numpy as np

from relaycfg.network import LoadStates, Network
from tests.reference.setting import setting

GRID, FIELD, ROUNDS, NEARER = 150, 60, 12, 0.3
"""Stars tried a side in the first round and the others, rounds, and how much smaller each next field is."""


def unseen(folder: Path, given: dict[str, Any]) -> dict[str, float]:
    """Largest |vn| with each of the first ``watched_count`` phases inside ``low_v`` to ``high_v``, neutral open.

    Every resistive star is tried by its shares of the conductance on L1 and L2, solved by the package; the field is
    drawn together around the best found.
    """
    watched, low, high = int(given.pop("watched_count")), given.pop("low_v"), given.pop("high_v")
    made = setting(folder, given)
    network = Network(made.site)
    middle, width, best = np.array([0.5, 0.5]), 1.0, -1.0
    count = GRID
    for _ in range(ROUNDS):
        side = width * np.linspace(-0.5, 0.5, count)
        first, second = (m + part.ravel() for m, part in zip(middle, np.meshgrid(side, side), strict=True))
        shares = np.clip(np.array([first, second, 1 - first - second]), 0.0, None)
        shares /= shares.sum(axis=0)
        states = LoadStates(shares, np.empty((0, count**2), np.int8), ("tried",) * count**2)
        solved = network.solve(made.at, states, made.emf)
        volts = np.abs(solved.l_n[-1, :watched])
        inside = ((volts >= low) & (volts <= high)).all(axis=0)
        shift = np.where(inside, np.abs(solved.joint_v), -1.0)
        found = int(shift.argmax())
        if shift[found] > best:
            best, middle = float(shift[found]), shares[:2, found]
        width, count = width * NEARER, FIELD
    return {"vn_v": best}
