"""A site read from a case's folder, set as a line of the case says: loads, joint, electrodes, supply level."""

from dataclasses import dataclass, replace
from fnmatch import fnmatchcase
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np

from relaycfg.files import read_site
from relaycfg.model.geometry import ComplexArray
from relaycfg.model.site import SOURCE, Site
from relaycfg.network import LoadStates, connected, healthy_emf

read = cache(read_site)


@dataclass(frozen=True)
class Setting:
    """A site with one load state: what a break of its neutral is solved from."""

    site: Site
    at: str
    joint_ohm: float | None
    states: LoadStates
    emf: ComplexArray
    board: str
    """Where the figures are taken."""


def setting(folder: Path, given: dict[str, Any]) -> Setting:
    """The setting that a line gives. Raises ValueError for a key it does not know.

    ``site`` (a file, site.toml), ``at`` (break place, source), ``joint_ohm`` (open), ``board`` (the last),
    ``supply_pu`` (1), ``source_electrode_ohm``, ``electrode_ohm.BOARD``, ``load.PATTERN`` (factor on the rating of
    every load of such a name, 1), and ``k_ratio`` with ``powers`` (load name to n: factor k ** n).
    """
    left = dict(given)
    site = read(folder / left.pop("site", "site.toml"))
    electrode = left.pop("source_electrode_ohm", site.source.electrode_ohm)
    site = replace(site, source=replace(site.source, electrode_ohm=electrode))
    factors = np.ones(len(site.loads))
    ratio, powers = left.pop("k_ratio", 1.0), left.pop("powers", {})
    for name, power in powers.items():
        factors[_loads(site, name)] *= ratio**power
    at, joint = left.pop("at", SOURCE), left.pop("joint_ohm", None)
    board, level = left.pop("board", site.boards[-1].name), left.pop("supply_pu", 1.0)
    for key, value in left.items():
        kind, _, name = key.partition(".")
        if kind == "load":
            factors[_loads(site, name)] *= value
        elif kind == "electrode_ohm":
            boards = [replace(b, electrode_ohm=value) if b.name == name else b for b in site.boards]
            site.board(name)
            site = replace(site, boards=tuple(boards))
        else:
            raise ValueError(f"{folder.name}: unknown key {key}")
    states = LoadStates(factors[:, None], connected(site).motors, ("as given",))
    return Setting(site, at, joint, states, healthy_emf(site, level), board)


def _loads(site: Site, pattern: str) -> list[int]:
    found = [k for k, load in enumerate(site.loads) if fnmatchcase(load.name, pattern)]
    if not found:
        raise ValueError(f"no load is named {pattern}")
    return found
