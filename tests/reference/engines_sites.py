"""Random sites for the comparisons with other engines: one to eight boards, every earthing and connection."""

from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from relaycfg.model.site import NONE, SOURCE, Load, Site
from relaycfg.network import LoadStates, connected, healthy_emf, join, sampled
from tests.network.sites import board, cable, load, motor, site

JOINTS = (None, 0.1, 1.0, 10.0)
"""Joint resistances [ohm] tried at every break place; None is the open break."""
EARTHINGS = ("TN-S", "TN-C-S", "TT")
LAWS = ("impedance", "impedance", "power", "zip")
"""Load law of a network by seed; impedance twice as often."""
POLYNOMIALS = ((0.4, 0.4, 0.2), (0.0, 1.0, 0.0), (0.5, 0.0, 0.5), (0.2, 0.2, 0.6))
PLACES = ("L1", "L2", "L3", "L1", "L2", "L3", "L1-L2", "L2-L3", "L3-L1", "all", "star")
IMPEDANCE, POWER = (1.0, 0.0, 0.0), (0.0, 0.0, 1.0)
UNBALANCE = np.array([1.0, 0.98, 1.01])
"""Of the EMFs' magnitudes; every state of every comparison has it."""


def kind_of(seed: int) -> tuple[str, str]:
    """Earthing and load law of a seed's network."""
    return EARTHINGS[seed % 3], LAWS[seed // 3 % len(LAWS)]


def random_site(seed: int) -> Site:
    """One to eight boards with loads of every connection; some boards bare, some idle, some sources unearthed."""
    rng = np.random.default_rng(seed)
    earthing, law = kind_of(seed)
    names = [f"B{k}" for k in range(rng.integers(1, 9))]
    boards = []
    for k, name in enumerate(names):
        line = complex(rng.uniform(0.02, 0.25), rng.uniform(0.005, 0.08))
        pe = {"TN-S": True, "TN-C-S": k > 0, "TT": bool(rng.random() < 0.3)}[earthing]
        wire = cable(line, rng.uniform(1, 2) * line, pe=rng.uniform(1, 2) * line if pe else None)
        bare = k > 0 and rng.random() < 0.15
        link = (earthing == "TN-C-S" and k == 0) or rng.random() < 0.08
        electrode = float(rng.uniform(2, 200)) if rng.random() < 0.4 else None
        up = names[rng.integers(k)] if k else SOURCE
        boards.append(board(name, up, None if bare else wire, link=link, electrode=electrode))
    loads = [made for name in names if rng.random() < 0.85 for made in random_loads(rng, name, law)]
    return site(
        boards,
        loads or [load(names[0], "L1", 500.0)],
        emf_v=float(rng.uniform(230, 240)),
        line_ohm=complex(rng.uniform(0.005, 0.03), rng.uniform(0.01, 0.05)),
        neutral_ohm=complex(*[(0.0, 0.0), (-0.001, -0.003), (0.01, 0.02)][rng.integers(3)]),
        star_link_ohm=float(rng.choice([0.0, 1e-3])),
        electrode_ohm=float(rng.uniform(0.5, 30)) if rng.random() < 0.8 else None,
        earth_at=str(rng.choice(["neutral-bar", "star-point"])),
        earthing=earthing,
        phase_order=str(rng.choice(["L1-L2-L3", "L1-L3-L2"])),
    )


def random_loads(rng: np.random.Generator, name: str, law: str) -> Iterator[Load]:
    """One to five loads of a board; on a nonlinear site a constant impedance on every line as well."""
    if law != "impedance":
        for line in ("L1", "L2", "L3"):
            yield load(name, line, float(rng.uniform(200, 2000)))
    for _ in range(rng.integers(1, 6)):
        place = str(rng.choice(PLACES))
        power = float(rng.uniform(100, 3000 if law == "impedance" else 1000))
        polynomial = {"impedance": IMPEDANCE, "power": POWER, "zip": POLYNOMIALS[rng.integers(4)]}[law]
        yield load(
            name,
            "all" if place == "star" else place,
            power,
            power * float(rng.uniform(-0.3, 0.6)),
            zip_p=polynomial,
            zip_q=POLYNOMIALS[rng.integers(4)] if law == "zip" else polynomial,
            band=(float(rng.uniform(0.5, 0.8)), float(rng.uniform(1.15, 1.4))),
            usage=0.7,
            demand=0.9,
            to_neutral=place == "star" if place in ("all", "star") else None,
        )


def heavy_site(seed: int) -> Site:
    """One to three boards whose loads are all constant power down to 0.7 of nominal, nothing else on the neutral."""
    rng = np.random.default_rng([seed, 2])
    names = [f"B{k}" for k in range(rng.integers(1, 4))]
    boards = [
        board(name, names[k - 1] if k else SOURCE, cable(line, pe=line), electrode=float(rng.uniform(5, 50)))
        for k, name in enumerate(names)
        for line in [complex(rng.uniform(0.02, 0.1), rng.uniform(0.01, 0.04))]
    ]
    loads = [
        load(name, line, power, power * float(rng.uniform(0, 0.3)), zip_p=POWER, band=(0.7, 1.2), usage=0.8)
        for name in names
        for line in ("L1", "L2", "L3")
        for power in [float(rng.uniform(200, 3000))]
    ]
    return site(boards, loads, line_ohm=0.01 + 0.02j, neutral_ohm=0.001 + 0.002j, electrode_ohm=5.0, emf_v=235.0)


def with_motors(made: Site, seed: int) -> Site:
    """The site with one to three motors more: three-wire ones and one on a line, at any board."""
    rng = np.random.default_rng([seed, 1])
    motors = []
    for k in range(rng.integers(1, 4)):
        running = float(rng.uniform(500, 3000)) * complex(1, rng.uniform(0.5, 1))
        starting = abs(running) * float(rng.uniform(4, 7)) * complex(0.4, 0.9)
        name = made.boards[rng.integers(len(made.boards))].name
        motors.append(motor(name, running, starting, "all" if k else str(rng.choice(["all", "L2"])), usage=0.6))
    return replace(made, motors=tuple(motors))


def states_of(made: Site, seed: int) -> LoadStates:
    """Everything connected, and one random load state."""
    return join(connected(made), sampled(made, 1, seed))


def emf_of(made: Site) -> np.ndarray:
    """The site's EMFs [lines], unbalanced."""
    emf: np.ndarray = healthy_emf(made) * UNBALANCE
    return emf


def cases(made: Site) -> list[tuple[str, float | None]]:
    """The sound network, and every break place with every joint."""
    return [(NONE, 0.0), *((place, joint_ohm) for place in made.places for joint_ohm in JOINTS)]
