"""The highest line-to-neutral voltage over all on/off combinations of the loads behind a break, proved.

All loads behind the break are constant impedances on one stiff bar; what is always on is fixed, groups switch
together, loads between lines do not move the neutral. With line admittances Y_k and a path back Y_p (electrodes), the
volts of a line are (Millman)
    |V_k| = |sum_l Y_l (E_k - E_l) + Y_p E_k| / |sum_l Y_l + Y_p|.
Closed form where all admittances share one angle: turned by that angle they are conductances G >= 0, so the numerator
is the magnitude of a linear function of the line sums (convex), and the denominator a positive linear one. The set
{numerator <= r * denominator} is convex for every r >= 0: the ratio is quasi-convex, and a quasi-convex function has
its maximum over a box at a corner: every line with all or none of its switched loads. A group or a star that acts on
several lines is one more side of the box. Otherwise the denominator is no longer linear, and the maximum may lie
anywhere: branch and bound.
Source: own algebra.
"""

from dataclasses import dataclass
from itertools import product

import numpy as np

from relaycfg.model.geometry import BoolArray, ComplexArray
from relaycfg.model.place_results import HighestVoltage, How
from relaycfg.model.site import Load, Motor, Site
from relaycfg.network import LoadStates, Network, least
from relaycfg.network.states import RUNNING
from relaycfg.study.asymmetry import electrode_path_s
from relaycfg.study.branch_and_bound import Largest, largest_ratio

MOST_WORK = 1_000_000
"""Boxes of branch and bound times switches for one place: some 2 s on a slow machine with forty switchable loads."""
MOST_SIDES = 12
ONE_ANGLE = 1e-9
"""Admittances whose angles differ by less share one [rad]."""


@dataclass(frozen=True)
class _Switch:
    """What is switched as one: admittance on each line [S], rows of loads and of motors."""

    admittance_s: ComplexArray
    loads: tuple[int, ...]
    motors: tuple[int, ...]


def highest_voltages(
    site: Site, network: Network, emf: ComplexArray, places: tuple[str, ...]
) -> tuple[HighestVoltage, ...]:
    """One result a place, in that order."""
    return tuple(highest_voltage(site, network, emf, place) for place in places)


def highest_voltage(site: Site, network: Network, emf: ComplexArray, place: str) -> HighestVoltage:
    """The highest volts at one break place; ``emf`` [lines] of the source."""
    fixed_s, switches = _switches(site, place)
    largest, how = _largest(emf, fixed_s, electrode_path_s(site, place), switches)
    on = [switch for switch, there in zip(switches, largest.on, strict=True) if there]
    state = worst_state(site, tuple(k for s in on for k in s.loads), tuple(k for s in on for k in s.motors))
    names = tuple(site.loads[k].name for s in on for k in s.loads)
    names += tuple(site.motors[k].name for s in on for k in s.motors)
    board, impedance_v = _in_network(site, network, emf, place, state, all_impedance=True)
    modelled_at, modelled_v = _in_network(site, network, emf, place, state, all_impedance=False)
    return HighestVoltage(
        place,
        largest.ratio,
        largest.bound,
        site.supply.geometry.names[largest.row],
        how,
        len(switches),
        largest.nodes,
        names,
        modelled_at or board,
        impedance_v,
        modelled_v,
    )


def worst_state(site: Site, loads: tuple[int, ...], motors: tuple[int, ...], name: str = "worst") -> LoadStates:
    """What is always on, and the loads and motors of those rows besides, each at its demand."""
    state = least(site)
    shares, running = state.loads.copy(), state.motors.copy()
    for k in loads:
        shares[k] = site.loads[k].demand
    running[list(motors)] = RUNNING
    return LoadStates(shares, running, (name,))


def named_state(site: Site, names: tuple[str, ...], name: str) -> LoadStates:
    """``worst_state`` of loads and motors by their names. Raises ValueError that lists the names not known."""
    known = {*(load.name for load in site.loads), *(motor.name for motor in site.motors)}
    strange = [n for n in names if n not in known]
    if strange:
        raise ValueError(", ".join(strange))
    loads = tuple(k for k, load in enumerate(site.loads) if load.name in names)
    motors = tuple(k for k, motor in enumerate(site.motors) if motor.name in names)
    return worst_state(site, loads, motors, name)


def _switches(site: Site, place: str) -> tuple[ComplexArray, tuple[_Switch, ...]]:
    """Admittances always on [lines], and what is switched, behind a break; members of a group in one."""
    behind = set(site.behind(place))
    fixed = np.zeros(len(site.supply.geometry.names), complex)
    gathered: dict[tuple[str, str], _Switch] = {}
    items: tuple[tuple[str, int, Load | Motor], ...] = (
        *(("load", k, load) for k, load in enumerate(site.loads)),
        *(("motor", k, motor) for k, motor in enumerate(site.motors)),
    )
    for kind, k, item in items:
        if item.board not in behind or not item.to_neutral or item.usage == 0:
            continue
        power = item.running_va if isinstance(item, Motor) else item.demand * complex(item.p_w, item.q_var)
        if power == 0:
            continue
        admittance = np.zeros_like(fixed)
        admittance[list(item.lines)] = power.conjugate() / len(item.lines) / site.supply.nominal_v**2
        if item.usage == 1:
            fixed += admittance
            continue
        group = item.group if isinstance(item, Load) else ""
        key = ("group", group) if group else (kind, str(k))
        old = gathered.get(key, _Switch(np.zeros_like(fixed), (), ()))
        loads, motors = ((k,), ()) if kind == "load" else ((), (k,))
        gathered[key] = _Switch(old.admittance_s + admittance, old.loads + loads, old.motors + motors)
    return fixed, tuple(gathered.values())


def _largest(
    emf: ComplexArray, fixed_s: ComplexArray, path_s: float, switches: tuple[_Switch, ...]
) -> tuple[Largest, How]:
    """The largest |V_k| over lines and combinations, and how it was found."""
    across = emf[:, None] - emf[None, :]
    y = np.array([s.admittance_s for s in switches]).reshape(len(switches), len(emf))
    a0, a = across @ fixed_s + path_s * emf, across @ y.T
    b0, b = complex(fixed_s.sum() + path_s), y.sum(axis=1)
    if not switches:
        volts = np.abs(a0) / abs(b0) if b0 else np.zeros(len(emf))
        row = int(volts.argmax())
        return Largest(float(volts[row]), row, np.zeros(0, bool), float(volts[row]), 0), "nothing to switch"
    sides = _sides(y, np.concatenate([fixed_s, [path_s]]))
    if sides is None:
        return largest_ratio(a0, a, b0, b, MOST_WORK // len(switches)), "branch and bound"
    on = np.array(list(product((False, True), repeat=len(sides)))) @ sides
    over = np.abs(b0 + on @ b)
    volts = np.where(over > 0, np.abs(a0[:, None] + a @ on.T) / np.where(over > 0, over, 1.0), 0.0)
    line, corner = (int(k) for k in np.unravel_index(int(volts.argmax()), volts.shape))
    best = float(volts[line, corner])
    return Largest(best, line, on[corner], best, 0), "closed form"


def _sides(y: ComplexArray, fixed: ComplexArray) -> BoolArray | None:
    """Sides [sides, switches] of the box whose corners hold the maximum; None where the closed form does not hold."""
    every = np.concatenate([y.ravel(), fixed])
    every = every[every != 0]
    angles = np.angle(every / every[0])
    if (np.abs(angles) > ONE_ANGLE).any():
        return None
    touched = y != 0
    alone = touched.sum(axis=1) == 1
    lines = [touched[:, k] & alone for k in range(y.shape[1])]
    several = np.eye(len(y), dtype=bool)[~alone]
    sides = np.array([*(line for line in lines if line.any()), *several])
    return sides if len(sides) <= MOST_SIDES else None


def _in_network(
    site: Site, network: Network, emf: ComplexArray, place: str, state: LoadStates, all_impedance: bool
) -> tuple[str, float | None]:
    """Board behind the break with the highest volts in the network, and those volts; None without a solution."""
    solved = network.solve(place, state, emf, all_impedance=all_impedance)
    if not solved.converged[0]:
        return "", None
    behind = [network.boards.index(b) for b in site.behind(place)]
    highest = np.abs(solved.l_n[behind, :, 0]).max(axis=1)
    at = int(highest.argmax())
    return network.boards[behind[at]], float(highest[at])
