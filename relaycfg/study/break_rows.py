"""Single break states as rows: every board and the relay's terminals, rounded nowhere."""

import math

import numpy as np

from relaycfg.model.break_results import BoardVolts, BreakRow, Flag, RelayVolts
from relaycfg.model.geometry import Geometry
from relaycfg.model.site import Relay, Site
from relaycfg.network import LoadStates, Network, Solved, tap
from relaycfg.relay import measured_quantities

SHORT_NAMES = {
    "line-to-neutral deviation": "l_n_deviation",
    "line-to-line deviation": "l_l_deviation",
    "V2/V1": "v2_v1",
    "spread": "spread",
}
NOT_KNOWN = complex(math.nan, math.nan)


def break_rows(
    site: Site, network: Network, place: str, states: LoadStates, emf: np.ndarray, joint_ohm: float | None
) -> tuple[BreakRow, ...]:
    """One row a state, as modelled, with its all-constant-impedance companion inside; no volts where unresolved."""
    modelled = network.solve(place, states, emf, joint_ohm, look_for_roots=True)
    impedance = network.solve(place, states, emf, joint_ohm, all_impedance=True)
    return tuple(
        _row(
            site,
            network,
            place,
            joint_ohm,
            name,
            modelled,
            k,
            _row(site, network, place, joint_ohm, name, impedance, k, None),
        )
        for k, name in enumerate(states.names)
    )


def _row(
    site: Site,
    network: Network,
    place: str,
    joint_ohm: float | None,
    name: str,
    solved: Solved,
    k: int,
    companion: BreakRow | None,
) -> BreakRow:
    geometry, resolved = site.supply.geometry, bool(solved.converged[k])
    volts, amperes = (complex(solved.joint_v[k]), complex(solved.joint_a[k])) if resolved else (NOT_KNOWN, NOT_KNOWN)
    return BreakRow(
        place,
        "" if place == "none" else site.conductor(place),
        joint_ohm,
        name,
        "converged" if resolved else "unresolved",
        _flags(solved, k),
        abs(amperes),
        abs(volts),
        (volts * amperes.conjugate()).real,
        {relay.name: _relay_volts(geometry, network, relay, solved, k) for relay in site.every_relay if resolved},
        {board: _board_volts(geometry, solved, index, k) for index, board in enumerate(network.boards) if resolved},
        companion,
    )


def _flags(solved: Solved, k: int) -> tuple[Flag, ...]:
    raised: list[tuple[Flag, bool]] = [
        ("below band", bool(solved.below_band[k])),
        ("above band", bool(solved.above_band[k])),
        ("unstable", bool(solved.unstable[k])),
        ("several solutions", bool(solved.several[k])),
    ]
    return tuple(flag for flag, there in raised if there)


def _board_volts(geometry: Geometry, solved: Solved, board: int, k: int) -> BoardVolts:
    l_n = solved.l_n[board, :, k]
    return BoardVolts(
        _floats(np.abs(l_n)),
        _floats(np.rad2deg(np.angle(l_n))),
        _floats(np.abs(geometry.line_to_line(l_n))),
        float(abs(geometry.displacement(l_n))),
        _magnitude(solved.n_earth[board, k]),
        _magnitude(solved.pe_earth[board, k]),
        _magnitude(solved.neutral_a[board, k]),
    )


def _relay_volts(geometry: Geometry, network: Network, relay: Relay, solved: Solved, k: int) -> RelayVolts:
    board = network.boards.index(relay.measures_at)
    terminals = tap(solved, board, relay.earth_reference)[k]
    measured = measured_quantities(geometry, terminals)
    return RelayVolts(
        _floats(measured["l_n_v"]),
        _floats(measured["l_l_v"]),
        float(measured["v0_v"]),
        _magnitude(solved.n_pe[board, k]),
        {SHORT_NAMES[name]: float(value) for name, value in measured["unbalance_percent"].items()},
        _magnitude(terminals[-1]),
    )


def _floats(values: np.ndarray) -> tuple[float, ...]:
    return tuple(float(v) for v in values)


def _magnitude(value: complex) -> float | None:
    size = abs(complex(value))
    return None if math.isnan(size) else size
