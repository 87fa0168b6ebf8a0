"""The greatest core that all elements together can clear: exact search over the few rungs that can matter."""

from itertools import combinations, product

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
    Each core state becomes the set of candidate rungs that clear it, as bits; equal sets are counted once.
    """
    pool = {f: candidates(ladder, _deadlines(scenarios, core)) for f, ladder in ladders.items()}
    signatures, counts = _signatures(ladders, pool, scenarios, core)
    first_bit, at = {}, 0
    for function in ladders:
        first_bit[function] = at
        at += len(pool[function])
    sets: dict[Function, Sets] = {}
    masks: dict[Function, NDArray[np.uint64]] = {}
    for function, ladder in ladders.items():
        numbered = list(enumerate(pool[function]))
        chosen = [
            subset
            for count in range(min(ladder.element.stages, len(numbered)) + 1)
            for subset in combinations(numbered, count)
        ]
        sets[function] = [tuple(rung for _, rung in subset) for subset in chosen]
        bits = [sum(1 << (first_bit[function] + k) for k, _ in subset) for subset in chosen]
        masks[function] = np.array(bits, np.uint64)
    best = _search(masks, signatures, counts) if _size(masks) <= MOST_SETS else _in_turn(masks, signatures, counts)
    return {f: sets[f][best[k]] for k, f in enumerate(ladders)}


def _deadlines(scenarios: tuple[Scenarios, ...], core: tuple[BoolArray, ...]) -> NDArray[np.floating]:
    seconds = [s.deadline_s[c] for s, c in zip(scenarios, core, strict=True)]
    return np.unique(np.concatenate(seconds)) if seconds else np.array([])


def _signatures(
    ladders: dict[Function, Ladder],
    pool: dict[Function, list[Rung]],
    scenarios: tuple[Scenarios, ...],
    core: tuple[BoolArray, ...],
) -> tuple[NDArray[np.uint64], NDArray[np.intp]]:
    """Distinct sets of candidate rungs that clear a core state, and how many states have each."""
    found = []
    for scenario, mask in zip(scenarios, core, strict=True):
        bits = np.zeros(int(mask.sum()), np.uint64)
        at = 0
        for function, ladder in ladders.items():
            for rung in pool[function]:
                bits |= covered_by(ladder, (rung,), scenario)[mask].astype(np.uint64) << np.uint64(at)
                at += 1
        found.append(bits)
    return np.unique(np.concatenate(found), return_counts=True) if found else (np.zeros(0, np.uint64), np.zeros(0, int))


def _size(masks: dict[Function, NDArray[np.uint64]]) -> int:
    return int(np.prod([len(m) for m in masks.values()], dtype=float))


def _cleared(mask: NDArray[np.uint64], signatures: NDArray[np.uint64], counts: NDArray[np.intp]) -> NDArray[np.intp]:
    """States cleared [sets] by each joint set of rungs."""
    total = np.zeros(len(mask), np.intp)
    for signature, count in zip(signatures, counts, strict=True):
        total += np.where((mask & signature) != 0, count, 0)
    return total


def _search(
    masks: dict[Function, NDArray[np.uint64]], signatures: NDArray[np.uint64], counts: NDArray[np.intp]
) -> tuple[int, ...]:
    index = list(product(*(range(len(m)) for m in masks.values())))
    joint = np.zeros(len(index), np.uint64)
    columns = np.array(index, np.intp).reshape(len(index), len(masks))
    for column, own in zip(columns.T, masks.values(), strict=True):
        joint |= own[column]
    total = _cleared(joint, signatures, counts)
    stages = np.bitwise_count(joint)
    best = int(np.lexsort((stages, -total))[0])
    return tuple(int(k) for k in columns[best])


def _in_turn(
    masks: dict[Function, NDArray[np.uint64]], signatures: NDArray[np.uint64], counts: NDArray[np.intp]
) -> tuple[int, ...]:
    chosen = [0] * len(masks)
    own = list(masks.values())
    for _ in range(len(masks) + 1):
        for k, mine in enumerate(own):
            others = np.uint64(0)
            for j, theirs in enumerate(own):
                if j != k:
                    others |= theirs[chosen[j]]
            chosen[k] = int(np.argmax(_cleared(mine | others, signatures, counts)))
    return tuple(chosen)
