"""Load states: which loads and motors are on, and at what share of their rating."""

from dataclasses import dataclass
from itertools import product

import numpy as np
from numpy.typing import NDArray

from relaycfg.model.geometry import FloatArray
from relaycfg.model.site import Load, Motor, Site

OFF, RUNNING, STARTING = 0, 1, 2
CHUNK = 4096
"""States drawn from one random stream; part of what a seed means."""


@dataclass(frozen=True)
class LoadStates:
    """States of all loads and motors of a site, in the site's order."""

    loads: FloatArray
    """[loads, states] factor on each load's rating: 0 off, its demand while on, 1 in ``connected``."""
    motors: NDArray[np.int8]
    """[motors, states] 0 off, 1 running, 2 starting."""
    names: tuple[str, ...]
    """One a state, such as "connected" or "sample 17"."""

    @property
    def count(self) -> int:
        """Number of states."""
        return len(self.names)

    def take(self, indices: NDArray[np.intp] | list[int]) -> "LoadStates":
        """The states of those indices, in that order."""
        chosen = np.asarray(indices, np.intp)
        return LoadStates(self.loads[:, chosen], self.motors[:, chosen], tuple(self.names[k] for k in chosen))


def join(*states: LoadStates) -> LoadStates:
    """The given states one after the other."""
    return LoadStates(
        np.concatenate([s.loads for s in states], axis=1),
        np.concatenate([s.motors for s in states], axis=1),
        tuple(name for s in states for name in s.names),
    )


def connected(site: Site) -> LoadStates:
    """Every load at its rating, usage and demand ignored, generation on, motors running; one state."""
    return LoadStates(np.ones((len(site.loads), 1)), np.full((len(site.motors), 1), RUNNING, np.int8), ("connected",))


def least(site: Site) -> LoadStates:
    """Only what is always on: loads and motors of usage 1, loads at their demand; one state."""
    loads = np.array([[_least_factor(load)] for load in site.loads]).reshape(-1, 1)
    motors = np.array([[_least_motor(motor)] for motor in site.motors], np.int8).reshape(-1, 1)
    return LoadStates(loads, motors, ("least",))


def corners(site: Site) -> LoadStates:
    """Each line's line-to-neutral loads (and motors) all at rating or as in ``least``; 2 ** lines states.

    Everything else, stars tied to N included, is as in ``connected``.
    """
    names = site.supply.geometry.names
    settings = list(product((True, False), repeat=len(names)))
    loads, motors = np.ones((len(site.loads), len(settings))), np.ones((len(site.motors), len(settings)), np.int8)
    for column, high in enumerate(settings):
        for row, load in enumerate(site.loads):
            if _on_one_line(load) and not high[load.lines[0]]:
                loads[row, column] = _least_factor(load)
        for row, motor in enumerate(site.motors):
            if _on_one_line(motor) and not high[motor.lines[0]]:
                motors[row, column] = _least_motor(motor)
    words = tuple(
        ", ".join(f"{name} {'high' if up else 'low'}" for name, up in zip(names, high, strict=True))
        for high in settings
    )
    return LoadStates(loads, motors, words)


def sampled(site: Site, samples: int, seed: int, start: int = 0) -> LoadStates:
    """Random states: each load on with probability ``usage``, at its demand; motors running with theirs.

    Loads of one group share one draw. States ``start`` to ``start + samples`` of the seed's endless series: each
    CHUNK of it has a random stream of its own, so a state never depends on how many are asked for, nor where.
    """
    draw_of_load, draws = _draws(site)
    usage = np.array([load.usage for load in site.loads]).reshape(-1, 1)
    demand = np.array([load.demand for load in site.loads]).reshape(-1, 1)
    motor_usage = np.array([motor.usage for motor in site.motors]).reshape(-1, 1)
    loads, motors = np.empty((len(site.loads), samples)), np.empty((len(site.motors), samples), np.int8)
    for chunk in range(start // CHUNK, -(-(start + samples) // CHUNK)):
        stream = np.random.default_rng(np.random.SeedSequence(seed, spawn_key=(chunk,)))
        uniform = stream.random((draws + len(site.motors), CHUNK))
        first, last = max(start, chunk * CHUNK), min(start + samples, (chunk + 1) * CHUNK)
        part, into = slice(first - chunk * CHUNK, last - chunk * CHUNK), slice(first - start, last - start)
        loads[:, into] = np.where(uniform[draw_of_load, part] < usage, demand, 0.0)
        motors[:, into] = np.where(uniform[draws:, part] < motor_usage, RUNNING, OFF)
    return LoadStates(loads, motors, tuple(f"sample {k}" for k in range(start, start + samples)))


def _draws(site: Site) -> tuple[list[int], int]:
    """The draw each load listens to, and how many draws there are."""
    numbers: dict[tuple[str, int], int] = {}
    listens = []
    for row, load in enumerate(site.loads):
        key = (load.group, -1) if load.group else ("", row)
        listens.append(numbers.setdefault(key, len(numbers)))
    return listens, len(numbers)


def _on_one_line(item: Load | Motor) -> bool:
    return item.to_neutral and len(item.lines) == 1


def _least_factor(load: Load) -> float:
    return load.demand if load.usage == 1 else 0.0


def _least_motor(motor: Motor) -> int:
    return RUNNING if motor.usage == 1 else OFF
