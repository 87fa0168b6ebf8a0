"""The greatest core that all elements together can clear: exact search over the few rungs that can matter."""

from collections.abc import Iterable
from functools import reduce
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from relaycfg.model.device import Function
from relaycfg.model.geometry import BoolArray
from relaycfg.study.choice import Rung, candidates, covered_by
from relaycfg.study.ladder import Ladder
from relaycfg.study.scenarios import Scenarios

MOST_SETS = 400_000
"""Joint sets searched whole; above it the elements are improved in turn, which may miss the best."""

Sets = list[tuple[Rung, ...]]


def joint_core(
    ladders: dict[Function, Ladder], scenarios: tuple[Scenarios, ...], core: tuple[BoolArray, ...]
) -> dict[Function, tuple[Rung, ...]]:
    """Secure stages of all elements that clear most of the ``core`` states, fewest stages among equals.

    Per element only the first rung that is fast enough for each deadline can matter (see ``choice.best_cover``).
    States that the same candidate rungs clear are counted as one kind.
    """
    if not ladders:
        return {}
    pool = {f: candidates(ladder, _deadlines(scenarios, core)) for f, ladder in ladders.items()}
    cleared, counts = _kinds(ladders, pool, scenarios, core)
    sets: dict[Function, Sets] = {}
    hits: list[BoolArray] = []
    for function, ladder in ladders.items():
        most = min(ladder.element.stages, len(pool[function]))
        chosen = [s for count in range(most + 1) for s in combinations(range(len(pool[function])), count)]
        sets[function] = [tuple(pool[function][k] for k in subset) for subset in chosen]
        hits.append(np.array([cleared[function][list(subset)].any(axis=0) for subset in chosen]))
    size = np.prod([len(hit) for hit in hits], dtype=float)
    stages = [np.array([len(subset) for subset in sets[f]]) for f in ladders]
    best = _search(hits, counts, stages) if size <= MOST_SETS else _in_turn(hits, counts)
    return {f: sets[f][k] for f, k in zip(ladders, best, strict=True)}


def _deadlines(scenarios: tuple[Scenarios, ...], core: tuple[BoolArray, ...]) -> NDArray[np.floating]:
    seconds = [s.deadline_s[c] for s, c in zip(scenarios, core, strict=True)]
    return np.unique(np.concatenate(seconds)) if seconds else np.array([])


def _kinds(
    ladders: dict[Function, Ladder],
    pool: dict[Function, list[Rung]],
    scenarios: tuple[Scenarios, ...],
    core: tuple[BoolArray, ...],
) -> tuple[dict[Function, BoolArray], NDArray[np.intp]]:
    """Which kinds of core state each candidate clears [candidates, kinds], and how many states are of each kind."""
    rows = [
        np.concatenate([covered_by(ladders[f], (rung,), s)[m] for s, m in zip(scenarios, core, strict=True)])
        for f in ladders
        for rung in pool[f]
    ]
    states = sum(int(mask.sum()) for mask in core)
    packed = np.packbits(np.array(rows, bool).reshape(len(rows), states), axis=0)
    kinds, counts = np.unique(packed, axis=1, return_counts=True)
    table = np.unpackbits(kinds, axis=0, count=len(rows)).astype(bool)
    ends = np.cumsum([len(pool[f]) for f in ladders])[:-1]
    return dict(zip(ladders, np.split(table, ends), strict=True)), counts


def _search(hits: list[BoolArray], counts: NDArray[np.intp], stages: list[NDArray[np.intp]]) -> tuple[int, ...]:
    """Every joint set: most states cleared, then fewest stages."""
    grid = np.ix_(*(np.arange(len(hit)) for hit in hits))
    shape = np.broadcast_shapes(*(axis.shape for axis in grid))
    total, used = np.zeros(shape, np.intp), np.zeros(shape, np.intp)
    for kind, count in enumerate(counts):
        total += np.where(_any(hit[axis, kind] for hit, axis in zip(hits, grid, strict=True)), count, 0)
    for number, axis in zip(stages, grid, strict=True):
        used += number[axis]
    best = int(np.lexsort((used.ravel(), -total.ravel()))[0])
    return tuple(int(k) for k in np.unravel_index(best, shape))


def _in_turn(hits: list[BoolArray], counts: NDArray[np.intp]) -> tuple[int, ...]:
    """One element after the other, given the others' sets."""
    chosen = [0] * len(hits)
    for _ in range(len(hits) + 1):
        for k, mine in enumerate(hits):
            others = (hit[chosen[j]] for j, hit in enumerate(hits) if j != k)
            chosen[k] = int(np.argmax(_any((mine, *others)) @ counts))
    return tuple(chosen)


def _any(flags: Iterable[BoolArray]) -> BoolArray:
    found: BoolArray = reduce(np.logical_or, flags)
    return found
